#include "analyse/gain_problem.h"

#include <algorithm>
#include <cmath>

#include "model/quantization.h"

namespace evenfield {

void follow(Statistics& s, bool curved) {
  s[kGain] = curved ? s[kCurved] : s[kLine];
  if (s[kGain]) s[kInverse] = 1 / *s[kGain];
  if (s[kGain] && s[kNoiseDn]) s[kNoiseE] = *s[kNoiseDn] / *s[kGain];
}

/// Line, origin line and curved model through the levels and the dark.
void GainProblem::fit_gains(int left_out, WholeFits& fits, Statistics& out) {
  const double reference = variance(plan_.reference_dark, left_out);
  std::vector<VariancePoint> points{{0.0, reference, dof(plan_.reference_dark, left_out)}};
  double cross = 0;
  double square = 0;
  for (const std::size_t index : plan_.gain_levels) {
    const Level& level = levels_.levels()[index];
    const double x = sums(level.series).mean(left_out) - mean(level.dark.mean, left_out);
    const double v = sums(level.series).variance(left_out);
    const double dark = variance(level.dark.variance, left_out);
    points.push_back({x, v - (dark - reference), sums(level.series).dof(left_out)});
    cross += x * (v - dark);
    square += x * x;
  }
  if (square > 0 && cross > 0) out[kOrigin] = cross / square;
  if (!plan_.lag_levels.empty()) out[kLagSummed] = lag_summed(points, left_out, fits);
  // A camera whose darks show no noise at all still has a line; it then begins with the lowest light.
  if (points.front().variance <= 0) points.erase(points.begin());
  if (points.size() == 1) {
    if (points.front().x > 0) out[kLine] = points.front().variance / points.front().x;
    return;
  }
  if (auto fit = fit_variance_line(points); fit && fit->slope > 0) {
    out[kLine] = fit->slope;
    if (left_out < 0) fits.line = *fit;
  }
  if (left_out < 0) {
    if (plan_.gain_levels.size() >= kCurveLevels)
      if (auto fit = fit_variance_curve(points); fit && fit->converged) fits.curve = *fit;
  } else if (fits.curve) {
    fits.curve = step_towards(*fits.curve, points);
  }
  if (fits.curve) {
    out[kCurved] = fits.curve->slope;
    out[kCurvature] = fits.curve->curvature;
  }
}

/// Slope of the line of variance plus neighbours' covariances; `points` are the dark and the levels of the
/// gain.
std::optional<double> GainProblem::lag_summed(const std::vector<VariancePoint>& points,
                                              int left_out,
                                              WholeFits& fits) {
  const auto with_lags = [&](VariancePoint point, double covariance, double pixels) {
    // A covariance of one difference of n pixels varies by V^2 / n, and each of four counts twice. Freedom is
    // told from numbers alone: weights that follow the scatter of the sums would bias the slope.
    point.degrees_of_freedom = 2 / (2 / point.degrees_of_freedom + 16 / pixels);
    point.variance += covariance;
    return point;
  };
  double dark_covariance = 0;
  double dark_pixels = 0;
  for (const auto& [series, weight] : plan_.reference_dark) {
    dark_covariance += weight * sums(series).neighbour_covariance(left_out);
    dark_pixels += sums(series).neighbour_pixels(left_out);
  }
  std::vector<VariancePoint> summed;
  if (points.front().variance > 0) summed.push_back(with_lags(points.front(), dark_covariance, dark_pixels));
  for (std::size_t i = 0; i < plan_.gain_levels.size(); ++i) {
    const std::size_t index = plan_.gain_levels[i];
    if (std::find(plan_.lag_levels.begin(), plan_.lag_levels.end(), index) == plan_.lag_levels.end())
      continue;
    const UnitSums& flat = sums(levels_.levels()[index].series);
    summed.push_back(
        with_lags(points[i + 1], flat.neighbour_covariance(left_out), flat.neighbour_pixels(left_out)));
  }
  for (const VariancePoint& point : summed)
    if (!(point.variance > 0)) return std::nullopt;
  const auto fit = fit_variance_line(summed);
  if (!fit || fit->slope <= 0) return std::nullopt;
  if (left_out < 0 && plan_.lag_levels.size() >= kCurveLevels)
    if (auto curve = fit_variance_curve(summed); curve && curve->converged) fits.lag_curve = *curve;
  return fit->slope;
}

Statistics GainProblem::at(int left_out, WholeFits& fits) {
  Statistics out;
  if (!plan_.gain_levels.empty()) fit_gains(left_out, fits, out);
  const double excess = variance(noise_dark_, left_out) - quantization_variance(levels_.codes().step_dn);
  if (!noise_dark_.empty() && excess > 0) out[kNoiseDn] = std::sqrt(excess);
  return out;
}

}  // namespace evenfield
