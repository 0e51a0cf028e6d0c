#include "model/variance_curve.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <string>
#include <vector>

#include "model/line_fit.h"

namespace evenfield {
namespace {

constexpr int kMaximumSteps = 200;

using Parameters = std::array<double, 3>;  // intercept, slope, curvature

/// (exp(u) - 1) / u
double mean_exponential(double u) { return std::abs(u) < 1e-12 ? 1 + u / 2 : std::expm1(u) / u; }

/// (u exp(u) - exp(u) + 1) / u^2, by its series sum u^k / (k! (k + 2)) where the difference would cancel.
double weighted_exponential(double u) {
  if (std::abs(u) > 0.5) return (u * std::exp(u) - std::expm1(u)) / (u * u);
  double sum = 0, term = 1;
  for (int k = 0; k < 20; term *= u / ++k) sum += term / (k + 2);
  return sum;
}

double value_at(const VariancePoint& point, const Parameters& p) {
  return curved_variance(point.x, p[0], p[1], p[2]);
}

bool usable(std::span<const VariancePoint> points, const Parameters& p) {
  return p[1] > 0 && std::all_of(points.begin(), points.end(), [&](const VariancePoint& point) {
           const double value = value_at(point, p);
           return std::isfinite(value) && value > 0;
         });
}

double deviance(std::span<const VariancePoint> points, const Parameters& p) {
  double sum = 0;
  for (const VariancePoint& point : points) {
    const double model = value_at(point, p);
    sum += point.degrees_of_freedom / 2 * (std::log(model) + point.variance / model);
  }
  return sum;
}

std::array<double, 3> derivatives_at(double x, const Parameters& p) {
  const double u = 2 * p[2] * x / p[1];
  return {1, x * (2 * mean_exponential(u) - std::exp(u)), 2 * x * x * weighted_exponential(u)};
}

/// The change of the parameters that weighted least squares asks for, linearized at p.
Result<LinearModel> scoring_step(std::span<const VariancePoint> points, const Parameters& p) {
  Matrix derivatives(static_cast<int>(points.size()), 3);
  std::vector<double> residuals, weights;
  for (int row = 0; row < derivatives.rows; ++row) {
    const VariancePoint& point = points[static_cast<std::size_t>(row)];
    const std::array<double, 3> slopes = derivatives_at(point.x, p);
    for (std::size_t k = 0; k < 3; ++k) derivatives(row, static_cast<int>(k)) = slopes[k];
    const double model = value_at(point, p);
    residuals.push_back(point.variance - model);
    weights.push_back(point.degrees_of_freedom / (2 * model * model));
  }
  return fit_linear_model(derivatives, residuals, weights);
}

}  // namespace

double curved_variance(double x, double intercept, double slope, double curvature) {
  return intercept + slope * x * mean_exponential(2 * curvature * x / slope);
}

Result<VarianceCurve> fit_variance_curve(std::span<const VariancePoint> points) {
  if (points.size() < 3) {
    return Error{
        Errc::input,
        {},
        "mean-variance curve: found " + std::to_string(points.size()) + " levels, expected at least 3"};
  }
  const Result<VarianceLine> line = fit_variance_line(points);
  if (!line) return line.error();
  Parameters now{line->intercept, line->slope, 0};
  if (!usable(points, now)) {
    return Error{
        Errc::input, {}, "mean-variance curve: found a falling line, expected variance to rise with signal"};
  }
  VarianceCurve curve;
  while (!curve.converged && curve.iterations < kMaximumSteps) {
    ++curve.iterations;
    const Result<LinearModel> step = scoring_step(points, now);
    if (!step) return step.error();
    const double before = deviance(points, now);
    double share = 1;
    Parameters next = now;
    const auto move = [&] {
      for (std::size_t i = 0; i < 3; ++i) next[i] = now[i] + share * step->coefficients[i];
    };
    const auto worse = [&] {
      return !usable(points, next) || deviance(points, next) > before + 1e-12 * std::abs(before);
    };
    for (move(); share > 1e-9 && worse(); move()) share /= 2;
    if (worse()) break;
    curve.converged = share == 1;
    for (std::size_t i = 0; i < 3; ++i) {
      const int at = static_cast<int>(i);
      const double tolerance =
          std::max(1e-12 * std::abs(next[i]), 1e-7 * std::sqrt(step->covariance(at, at)));
      curve.converged = curve.converged && std::abs(next[i] - now[i]) <= tolerance;
    }
    now = next;
  }
  const Result<LinearModel> end = scoring_step(points, now);
  if (!end) return end.error();
  curve.intercept = now[0];
  curve.slope = now[1];
  curve.curvature = now[2];
  curve.covariance = end->covariance;
  for (const VariancePoint& point : points) {
    const double relative = point.variance / value_at(point, now) - 1;
    curve.chi2 += point.degrees_of_freedom / 2 * relative * relative;
  }
  curve.degrees_of_freedom = static_cast<double>(points.size()) - 3;
  return curve;
}

VarianceCurve step_towards(const VarianceCurve& curve, std::span<const VariancePoint> points) {
  const Parameters now{curve.intercept, curve.slope, curve.curvature};
  Parameters gradient{0, 0, 0};
  for (const VariancePoint& point : points) {
    const double model = value_at(point, now);
    const double pull = point.degrees_of_freedom / (2 * model * model) * (point.variance - model);
    const std::array<double, 3> slopes = derivatives_at(point.x, now);
    for (std::size_t k = 0; k < 3; ++k) gradient[k] += slopes[k] * pull;
  }
  VarianceCurve out = curve;
  const std::array<double*, 3> parameters{&out.intercept, &out.slope, &out.curvature};
  for (int i = 0; i < 3; ++i)
    for (int k = 0; k < 3; ++k)
      *parameters[static_cast<std::size_t>(i)] +=
          curve.covariance(i, k) * gradient[static_cast<std::size_t>(k)];
  return out;
}

}  // namespace evenfield
