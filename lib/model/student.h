#pragma once
/// Quantiles: how many standard uncertainties an interval is wide. Absent degrees of freedom mean the normal
/// distribution. Degrees of freedom are > 0 and may be fractional, probabilities lie inside (0, 1); outside
/// of that the answer is NaN.

#include <optional>
#include <utility>

namespace evenfield {

/// Standard normal distribution function and its inverse.
double normal_cumulative(double z);
double normal_quantile(double probability);

/// Student's t: P(T < result) = probability.
double student_quantile(double probability, std::optional<double> degrees_of_freedom);
/// Student's t: P(T < t).
double student_cumulative(double t, std::optional<double> degrees_of_freedom);

/// k of the two-sided interval value +- k u that holds the truth with this probability.
double coverage_factor(double probability, std::optional<double> degrees_of_freedom);

/// P(chi^2 of these degrees of freedom < result) = probability.
double chi_square_quantile(double probability, double degrees_of_freedom);

/// P(chi^2 of these degrees of freedom > chi2): how likely scatter this large is by chance.
double chi_square_excess(double chi2, double degrees_of_freedom);

/// Two-sided interval of a standard deviation, as factors of the observed one: sqrt(nu / chi^2).
std::pair<double, double> deviation_interval_factors(double probability, double degrees_of_freedom);

}  // namespace evenfield
