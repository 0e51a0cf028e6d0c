#pragma once
/// The curved mean-variance relation of sensors whose pixels repel charge:
///   V = b + K^2 / (2 a) (exp(2 a x / K) - 1) = b + K x + a x^2 + ...
/// x and b in DN and DN^2, K the gain at low signal [DN/e-], a the curvature [1/e-], 0 for a straight line.
/// Fitted by maximum likelihood like the line (weights nu / (2 V^2) of the model).
/// Source: Astier et al. 2019, A&A 629 A36, equation 16 (from memory; first terms seen), re-derived in
/// METHODS 7.4.

#include <span>

#include "base/error.h"
#include "model/matrix.h"
#include "model/variance_line.h"

namespace evenfield {

/// The relation itself, smooth through a = 0.
double curved_variance(double x, double intercept, double slope, double curvature);

struct VarianceCurve {
  double intercept = 0;  ///< b [DN^2]
  double slope = 0;      ///< K [DN/e-]
  double curvature = 0;  ///< a [1/e-]
  Matrix covariance;     ///< 3 x 3: intercept, slope, curvature
  double chi2 = 0;
  double degrees_of_freedom = 0;  ///< points - 3
  int iterations = 0;
  bool converged = false;

  double at(double x) const { return curved_variance(x, intercept, slope, curvature); }
};

/// Needs 3 points of different x. Errors as fit_variance_line().
Result<VarianceCurve> fit_variance_curve(std::span<const VariancePoint> points);

/// `curve` after one step of the fit towards `points`, which differ little from those it was fitted to (a
/// jackknife's): off by the square of what the points moved. Its covariance stays.
VarianceCurve step_towards(const VarianceCurve& curve, std::span<const VariancePoint> points);

}  // namespace evenfield
