#pragma once
/// Histograms of the values of an averaged image, and of how far they are from their mean. Source: rule of
/// EMVA 1288 (from memory), METHODS 5.5: means of L frames of whole numbers are multiples of 1/L, and a bin
/// holds the same number of them as every other, or the histogram would show stripes that are not there.

#include <cstdint>
#include <span>
#include <vector>

namespace evenfield {

/// Equal bins, at most 256.
struct ValueBins {
  double first = 0;  ///< centre of the first bin, in the unit of the values
  double width = 1;
  int count = 1;

  double centre(int bin) const { return first + bin * width; }
  /// Values beyond the ends belong to the end bins.
  int bin_of(double value) const;
};

/// For multiples of 1/frames (less any constant) from `lowest` to `highest`, both finite and in order:
/// I = floor(L (highest - lowest)/256) + 1 multiples a bin, floor(L (highest - lowest)/I) + 1 bins of width
/// I/L. Edges lie half way between multiples, so that rounding moves no value into the next bin.
ValueBins bins_of_means(double lowest, double highest, int frames);

/// For values of any fraction: 256 bins over the range; one bin of width 1 if it is empty.
ValueBins bins_of_range(double lowest, double highest);

/// Values in each bin.
std::vector<std::int64_t> count_values(std::span<const float> values, const ValueBins& bins);

/// counts[k] values deviate from `mean` by `k x step` or more, up and down together; counts[0] is all of
/// them, the last count is not 0. `step` > 0; at most 100000 counts, what deviates more is in the last.
std::vector<std::int64_t> count_deviations(std::span<const float> values, double mean, double step);

/// What a normal curve of this standard deviation counts in a bin at `value`:
/// n width / (sqrt(2 pi) sigma) exp(-(value - mean)^2 / (2 sigma^2)).
double normal_count(double pixels, double bin_width, double value, double mean, double standard_deviation);

}  // namespace evenfield
