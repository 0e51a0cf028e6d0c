#pragma once
/// Temporal noise in the dark, in electrons, freed of quantization: r = sqrt(V - q) / K. V [DN^2] is a dark
/// variance or the intercept of the mean-variance line, q the quantization variance [DN^2]. Source:
/// METHODS 2.

#include <optional>

#include "model/variance_line.h"

namespace evenfield {

struct ReadNoise {
  double value_e = 0;
  double standard_uncertainty_e = 0;
};

/// From darks of nu degrees of freedom and an independent gain; absent if V <= q.
std::optional<ReadNoise> read_noise_from_dark(double dark_variance,
                                              double degrees_of_freedom,
                                              double quantization,
                                              double gain,
                                              double gain_relative_uncertainty);

/// From the intercept of the line, with the covariance of intercept and slope; absent if intercept <= q or
/// slope <= 0.
std::optional<ReadNoise> read_noise_from_line(const VarianceLine& line, double quantization);

/// Mean of the standard deviation of F normal samples over the true one: c4(F). F >= 2, else NaN.
double deviation_bias(int frames);

/// Median of the standard deviation of F normal samples over the true one. F >= 2, else NaN.
double deviation_median(int frames);

/// The same where the true deviations differ from pixel to pixel: `log_variance` is the variance of ln S over
/// the pixels that was observed. Between the factor of equal pixels and exp(mean of ln S), which a wide
/// population tends to: the skewness of ln S counts for less as the population spreads it (Cornish and
/// Fisher's first term, derived).
double deviation_median(int frames, double log_variance);
/// Variance of ln S of equal pixels: trigamma((F-1)/2) / 4.
double deviation_log_variance(int frames);

}  // namespace evenfield
