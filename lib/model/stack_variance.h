#pragma once
/// Temporal variance of a stack of equally exposed frames by its plain definition, and how much it scatters.
/// The engine in accumulate computes the same from exact sums; this is its oracle.
///   raw   = 1/(n (F-1)) sum_i sum_f (y_f[i] - mean_f y[i])^2
///   drift = 1/(F-1) sum_f (frame mean_f - their mean)^2
/// Source: METHODS 1.2; for F = 2 the two-frame forms of EMVA 1288 (from memory).

#include <span>
#include <vector>

#include "base/error.h"

namespace evenfield {

struct StackVariance {
  double raw = 0;
  double drift = 0;
  double corrected = 0;            ///< raw - drift
  double unbiased = 0;             ///< corrected x n / (n-1): the frame means cost degrees of freedom
  double mean_image_variance = 0;  ///< of the pixels of the averaged frame, n - 1 in the denominator
  double degrees_of_freedom = 0;   ///< (n-1)(F-1), of `unbiased`
};

/// `frames`: at least 2, of equal size of at least 2 pixels, else error `input`.
Result<StackVariance> temporal_variance(std::span<const std::vector<double>> frames);

/// A camera of Poisson electrons and normal dark noise.
struct PoissonCamera {
  double gain_dn_per_e = 0;
  double signal_e = 0;       ///< mean per pixel
  double dark_sigma_dn = 0;  ///< quantization included
};

/// Sampling variance of the pooled temporal variance V of n pixels and F frames [DN^4]:
/// (1/n) [2 V^2/(F-1) + K^4 Ne/F].
double variance_of_variance(const PoissonCamera& camera, double pixels, double frames);

/// Sampling variance of the residual V - K mean: kurtosis and error of the mean cancel, (1/n)[2 V^2/(F-1) +
/// K^2 d^2/F].
double variance_of_line_residual(const PoissonCamera& camera, double pixels, double frames);

}  // namespace evenfield
