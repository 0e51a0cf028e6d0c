#pragma once
/// Fixed pattern of an averaged stack of L frames of n pixels each: variance s^2 freed of temporal noise,
/// DSNU and PRNU, and how well they are known. Variances in DN^2, `temporal` is the variance of one pixel in
/// one frame. Source: EMVA 1288 chapters 4 and 8 (from memory); variances derived in METHODS 5.1.

#include <cstdint>
#include <optional>

namespace evenfield {

/// Size of a stack and its temporal variance.
struct StackSize {
  double pixels = 0;
  double frames = 0;
};

/// s^2 = measured - temporal / frames. May be negative: then not resolved, never to be clamped in silence.
double spatial_variance(double measured, double temporal, double frames);

/// Variance of s^2 for the sensor at hand, whose pattern was measured pixel by pixel: temporal noise alone.
///   [4 s^2 t/L + 2 t^2/L^2] / n + 2 t^2 / (L^2 n (L-1)), s^2 taken as 0 where negative; needs L >= 2.
double spatial_variance_variance(double spatial, double temporal, StackSize size);

/// The same if these pixels were a sample of a population (normal pattern): larger.
///   2 (s^2 + t/L)^2 / (n-1) + 2 t^2 / (L^2 n (L-1))
double spatial_variance_variance_of_population(double spatial, double temporal, StackSize size);

/// Covariance of two frames as an estimator of s^2, population form: [(s^2 + t)^2 + s^4] / (n-1).
double frame_pair_covariance_variance(double spatial, double temporal, double pixels);

/// A value with its standard uncertainty, or, when the variance behind it is negative, an upper bound only.
struct SpatialResult {
  std::optional<double> value;
  std::optional<double> standard_uncertainty;
  double high95 = 0;  ///< one-sided 95 % bound, from s^2 + 1.645 u(s^2), not below 0
};

/// Square root of a spatial variance over `divisor`: DSNU in e- with divisor K [DN/e-], in DN with divisor 1;
/// PRNU as a fraction with spatial = s^2(flat) - s^2(dark) and divisor the signal [DN]. The divisor's own
/// uncertainty is left out, because it is common to many quantities.
SpatialResult spatial_deviation(double spatial, double variance_of_spatial, double divisor);

}  // namespace evenfield
