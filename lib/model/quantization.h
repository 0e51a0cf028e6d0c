#pragma once
/// What rounding to whole codes does to mean and variance. Source: METHODS 1.4, from the characteristic
/// function of a rounded normal variable; step^2 / 12 is its limit for noise well above one step.

namespace evenfield {

/// step^2 / 12 [DN^2]: variance of an error spread evenly over one step.
constexpr double quantization_variance(double step_dn) { return step_dn * step_dn / 12.0; }

/// Mean and variance after a normal variable (mean, standard deviation) was rounded to multiples of 1. In
/// units of the step: divide by it before, multiply after.
struct RoundedNormal {
  double mean = 0;
  double variance = 0;
};
RoundedNormal rounded_normal(double mean, double standard_deviation);

/// Below this variance of darks, in steps^2, rounding hides the noise and only an upper limit can be given
/// (EMVA 1288, from memory); from there to kCoarseVariance
/// it is off by up to 13 %, falling to 0.3 %, with the place of the offset between codes.
constexpr double kUnresolvedVariance = 0.24;
constexpr double kCoarseVariance = 0.45;

/// Upper limit of the noise when the variance is unresolved: sqrt(0.24 - 1/12) and, with rounding,
/// sqrt(0.24), both times the step [DN].
double unresolved_noise_limit(double step_dn);
double unresolved_noise_limit_with_rounding(double step_dn);

}  // namespace evenfield
