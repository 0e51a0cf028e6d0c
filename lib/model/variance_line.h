#pragma once
/// The mean-variance line of photon transfer, V = b + K x: x is the mean signal [DN], V the temporal variance
/// [DN^2], K the gain [DN/e-], b the variance in the dark [DN^2]. V of nu degrees of freedom is distributed
/// as m chi^2(nu) / nu about its model m; maximum likelihood is then iteratively reweighted least squares
/// with the weights nu / (2 m^2) of the model. Weights from the measured V would bias K by about -4/nu.
/// Errors of x need no term: those of the shot noise cancel against the kurtosis. Source: derived,
/// METHODS 1.2 and 7.1; bound: inverse of the Fisher information, METHODS 7.2.

#include <span>

#include "base/error.h"

namespace evenfield {

struct VariancePoint {
  double x = 0;                   ///< mean less dark mean [DN]; 0 for the dark level
  double variance = 0;            ///< [DN^2], > 0
  double degrees_of_freedom = 0;  ///< > 0; pixels x (frames - 1) for independent pixels
};

struct VarianceLine {
  double intercept = 0;           ///< b [DN^2]
  double slope = 0;               ///< K [DN/e-]
  double intercept_variance = 0;  ///< from the degrees of freedom alone
  double slope_variance = 0;
  double covariance = 0;  ///< of intercept and slope, negative as a rule
  double chi2 = 0;
  double degrees_of_freedom = 0;  ///< points - 2
  int iterations = 0;
  bool converged = false;  ///< both stand still to 1e-12 of themselves or 1e-9 of u

  double at(double x) const { return intercept + slope * x; }
  double correlation() const;
  /// sqrt(chi2 / degrees of freedom) where that exceeds 1, else 1: by this much the scatter widens
  /// uncertainties.
  double spread() const;
};

/// Needs 2 points of different x. Error `input` for a variance or degrees of freedom that are not > 0 or for
/// a value that is not finite. The model stays > 0 at every point; `converged` is false where 200 steps were
/// not enough.
Result<VarianceLine> fit_variance_line(std::span<const VariancePoint> points);

/// Smallest variances that any unbiased estimator of K and b can reach at these levels (`variance` of the
/// points is not read): the yardstick of the fit and the rule of planning.
Result<VarianceLine> variance_line_bound(double intercept,
                                         double slope,
                                         std::span<const VariancePoint> points);

}  // namespace evenfield
