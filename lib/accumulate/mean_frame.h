#pragma once
/// A second look at one series: the mean over its frames of each pixel, and, if wanted, each pixel's temporal
/// variance.
///
/// Bands of rows are shared out among the threads; a band is read from one frame after the other and summed
/// in cache. Sums of integer pixels are exact before the division, sums of floating ones are taken in the
/// order of the frames: every number is the same for any number of threads.

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "base/error.h"
#include "base/image.h"
#include "ingest/frame_stack.h"

namespace evenfield {

struct MeanFrameOptions {
  int threads = 1;
  /// [region][frame] mean of the frame over the region [DN]. Given, temporal variances are computed too, with
  /// the changes of these means taken out, so that an offset that jitters from frame to frame is not in them.
  std::vector<std::vector<double>> frame_means;
  /// [region] a pixel's highest sample that stands above the mean of the others by more than this [DN], while
  /// those agree among themselves, is a hit and left out of the mean (not out of the variance). Empty or 0:
  /// none is.
  std::vector<double> hit_limits;
};

/// Of one region, row by row.
struct PixelMeans {
  Rect rect;
  int frames = 0;
  /// To be added to `mean`: a value near the region's, because a float would cut digits.
  double level_dn = 0;
  std::unique_ptr<float[]> mean;  ///< mean over frames less level_dn [DN]
  /// Temporal variance [DN^2], sum of squares over frames - 1; infinite where a float cannot hold it. Null if
  /// it was not wanted or there is but one frame.
  std::unique_ptr<float[]> variance;

  std::size_t pixels() const {
    return static_cast<std::size_t>(rect.width) * static_cast<std::size_t>(rect.height);
  }
  std::span<const float> means() const { return {mean.get(), pixels()}; }
  std::span<float> variances() const { return {variance.get(), variance ? pixels() : 0}; }
};

/// One for each of `regions`, which lie inside the frame and may overlap. Rows are read once for all of them.
/// Errors (input): rows that cannot be read, a pixel that is not a finite number, a mean that a float cannot
/// hold, more than kMostFrames frames.
Result<std::vector<PixelMeans>> mean_frame(const FrameStack& frames,
                                           const std::vector<Rect>& regions,
                                           const MeanFrameOptions& options);

/// Median of the square roots of `variances`, the mean of the two middle ones if their number is even; with
/// the variances of a dark series the median read noise [DN]. Not for an empty span. The variances are left
/// in another order: a copy of an image would double the memory.
double median_deviation(std::span<float> variances);

/// Variance of the logarithms of those roots, from their quartiles, as if they were normally distributed:
/// what a few noisy pixels do not move. 0 if a quarter has no variance.
double log_deviation_variance(std::span<float> variances);

}  // namespace evenfield
