#pragma once
/// Least squares: straight lines, lines through the origin, and linear models of several regressors.
/// Solved by orthogonal factors of scaled columns or by centred sums, never by normal equations on raw
/// abscissae, which lose half of the digits. Error `input` says which point is unusable or what is missing.

#include <span>
#include <vector>

#include "base/error.h"
#include "model/matrix.h"

namespace evenfield {

struct LinePoint {
  double x = 0;
  double y = 0;
  double weight = 1;  ///< 1 / variance of y; equal weights where the variance is unknown
};

/// y = intercept + slope x. Variances follow from the weights alone; where the weights are only relative,
/// call scaled_by_residuals().
struct Line {
  double intercept = 0;
  double slope = 0;
  double intercept_variance = 0;
  double slope_variance = 0;
  double covariance = 0;  ///< of intercept and slope
  double chi2 = 0;        ///< sum of weight x residual^2
  int points = 0;
  double degrees_of_freedom = 0;  ///< points less parameters

  double at(double x) const { return intercept + slope * x; }
  double variance_at(double x) const {
    return intercept_variance + x * (2 * covariance + x * slope_variance);
  }
  double correlation() const;  ///< of intercept and slope; 0 for a line through the origin
};

/// Weighted line. Needs 2 points of different x; weights finite and > 0.
Result<Line> fit_line(std::span<const LinePoint> points);

/// Weighted line through the origin: slope = sum w x y / sum w x^2. Needs 1 point with x != 0.
Result<Line> fit_line_through_origin(std::span<const LinePoint> points);

/// The same line with its variances multiplied by chi2 / degrees of freedom. Error if there are none left.
Result<Line> scaled_by_residuals(const Line& line);

/// y = sum_j coefficients[j] x regressor_j.
struct LinearModel {
  std::vector<double> coefficients;
  Matrix covariance;  ///< of the coefficients, for unit variance of the weighted residuals
  double chi2 = 0;    ///< sum of weight x residual^2
  int points = 0;
  double degrees_of_freedom = 0;
  /// Standard uncertainty of a coefficient, scaled by the residuals' own spread; 0 degrees of freedom: NaN.
  double scaled_uncertainty(int coefficient) const;
};

/// `regressors` has a row per point and a column per coefficient (a constant term is a column of ones);
/// `weights` is empty (all equal) or one per point. Error if points are too few or columns depend on each
/// other.
Result<LinearModel> fit_linear_model(const Matrix& regressors,
                                     std::span<const double> y,
                                     std::span<const double> weights = {});

/// Polynomial y = c0 + c1 x + ... of the given degree, x scaled inside to magnitude 1.
Result<LinearModel> fit_polynomial(std::span<const LinePoint> points, int degree);

}  // namespace evenfield
