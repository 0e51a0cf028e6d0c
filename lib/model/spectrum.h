#pragma once
/// Power spectrum of the lines of an image, mean over the lines: shows periodic structure that a variance
/// only adds up. Source: spectrograms of EMVA 1288 (from memory), METHODS 5.4.
///   Y_m[v] = (1/sqrt N) sum_n (y_m[n] - mean of the image) exp(-2 pi i n v / N),  p[v] = mean over m
///   |Y_m[v]|^2
/// The mean of p over v = 0 .. N-1 is the variance of the image.

#include <span>
#include <vector>

#include "base/error.h"

namespace evenfield {

enum class LineDirection { rows, columns };

struct Spectrum {
  int length = 0;             ///< N, pixels of a line
  int lines = 0;              ///< lines averaged; p[v] scatters by 1/sqrt(lines), relatively
  std::vector<double> power;  ///< p[v], v = 0 .. N/2 [unit^2], at v/N cycles a pixel; p[N - v] = p[v]
};

/// `image` is rows first, `width` x `height`, all finite; any length, primes too. The same bits for any
/// number of threads. Errors `input`: an image without pixels; what the transform refuses.
Result<Spectrum> line_spectrum(
    std::span<const float> image, int width, int height, LineDirection direction, int threads = 1);

/// Mean of p over all N frequencies: the population variance of the image.
double spectrum_variance(const Spectrum& spectrum);

/// Median of p[1] .. p[N/2], the part that is white noise: few peaks do not move it. Without p[0], which
/// holds the differences between the lines' means and for one line nothing. Over few lines it lies below the
/// mean of white noise: by 1/(3 lines), relatively. 0 for lines of one pixel.
double white_part(const Spectrum& spectrum);

/// The same spectrum without the white noise of this variance, which averaging L frames has left in each
/// pixel: sigma^2/L off every p[v]. Scatter may leave a p[v] below 0.
Spectrum without_noise(Spectrum spectrum, double noise_variance);

/// Variance over white part: 1 for white noise, more with structure. NaN unless the white part is > 0.
double non_whiteness(const Spectrum& spectrum);

}  // namespace evenfield
