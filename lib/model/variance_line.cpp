#include "model/variance_line.h"

#include <algorithm>
#include <cmath>
#include <string>
#include <vector>

#include "base/text.h"
#include "model/line_fit.h"

namespace evenfield {
namespace {

constexpr int kMaximumSteps = 200;

Error unusable(std::string what) { return Error{Errc::input, {}, std::move(what)}; }

bool positive_everywhere(std::span<const VariancePoint> points, double intercept, double slope) {
  return std::all_of(points.begin(), points.end(),
                     [&](const VariancePoint& point) { return intercept + slope * point.x > 0; });
}

/// Minus the logarithm of the likelihood, less what no parameter changes.
double deviance(std::span<const VariancePoint> points, double intercept, double slope) {
  double sum = 0;
  for (const VariancePoint& point : points) {
    const double model = intercept + slope * point.x;
    sum += point.degrees_of_freedom / 2 * (std::log(model) + point.variance / model);
  }
  return sum;
}

/// The line of weights nu / (2 m^2), m as given for each point.
Result<Line> reweighted(std::span<const VariancePoint> points, std::span<const double> model) {
  std::vector<LinePoint> weighted;
  weighted.reserve(points.size());
  for (std::size_t i = 0; i < points.size(); ++i) {
    weighted.push_back(
        {points[i].x, points[i].variance, points[i].degrees_of_freedom / (2 * model[i] * model[i])});
  }
  return fit_line(weighted);
}

std::vector<double> model_at(std::span<const VariancePoint> points, double intercept, double slope) {
  std::vector<double> model;
  model.reserve(points.size());
  for (const VariancePoint& point : points) model.push_back(intercept + slope * point.x);
  return model;
}

void adopt_covariance(VarianceLine& result, const Line& line) {
  result.intercept_variance = line.intercept_variance;
  result.slope_variance = line.slope_variance;
  result.covariance = line.covariance;
}

}  // namespace

double VarianceLine::correlation() const {
  const double scale = std::sqrt(intercept_variance * slope_variance);
  return scale > 0 ? covariance / scale : 0.0;
}

double VarianceLine::spread() const {
  return degrees_of_freedom > 0 ? std::max(1.0, std::sqrt(chi2 / degrees_of_freedom)) : 1.0;
}

Result<VarianceLine> fit_variance_line(std::span<const VariancePoint> points) {
  std::vector<double> measured;
  for (std::size_t i = 0; i < points.size(); ++i) {
    const VariancePoint& point = points[i];
    const bool usable = std::isfinite(point.x) && std::isfinite(point.variance) && point.variance > 0 &&
                        std::isfinite(point.degrees_of_freedom) && point.degrees_of_freedom > 0;
    if (!usable) {
      return unusable("mean-variance line, level " + std::to_string(i + 1) + ": found signal " +
                      to_text(point.x) + ", variance " + to_text(point.variance) + ", degrees of freedom " +
                      to_text(point.degrees_of_freedom) + ", expected finite numbers, the last two above 0");
    }
    measured.push_back(point.variance);
  }
  Result<Line> step = reweighted(points, measured);
  if (!step) return step.error();

  VarianceLine line;
  line.intercept = step->intercept;
  line.slope = step->slope;
  if (!positive_everywhere(points, line.intercept, line.slope)) {
    double sum = 0;
    for (const double variance : measured) sum += variance;
    line.intercept = sum / static_cast<double>(measured.size());
    line.slope = 0;
  }
  while (!line.converged && line.iterations < kMaximumSteps) {
    ++line.iterations;
    step = reweighted(points, model_at(points, line.intercept, line.slope));
    if (!step) return step.error();
    // A full step may leave the model negative or overshoot where few degrees of freedom scatter widely.
    const double before = deviance(points, line.intercept, line.slope);
    double share = 1;
    double intercept = step->intercept, slope = step->slope;
    const auto worse = [&] {
      return !positive_everywhere(points, intercept, slope) ||
             deviance(points, intercept, slope) > before + 1e-12 * std::abs(before);
    };
    while (share > 1e-9 && worse()) {
      share /= 2;
      intercept = line.intercept + share * (step->intercept - line.intercept);
      slope = line.slope + share * (step->slope - line.slope);
    }
    if (worse()) break;
    const auto still = [](double change, double value, double variance) {
      return std::abs(change) <= std::max(1e-12 * std::abs(value), 1e-9 * std::sqrt(variance));
    };
    line.converged = share == 1 && still(intercept - line.intercept, intercept, step->intercept_variance) &&
                     still(slope - line.slope, slope, step->slope_variance);
    line.intercept = intercept;
    line.slope = slope;
  }
  const std::vector<double> model = model_at(points, line.intercept, line.slope);
  step = reweighted(points, model);
  if (!step) return step.error();
  adopt_covariance(line, *step);
  for (std::size_t i = 0; i < points.size(); ++i) {
    const double relative = (points[i].variance - model[i]) / model[i];
    line.chi2 += points[i].degrees_of_freedom / 2 * relative * relative;
  }
  line.degrees_of_freedom = static_cast<double>(points.size()) - 2;
  return line;
}

Result<VarianceLine> variance_line_bound(double intercept,
                                         double slope,
                                         std::span<const VariancePoint> points) {
  const std::vector<double> model = model_at(points, intercept, slope);
  for (std::size_t i = 0; i < points.size(); ++i) {
    if (!(model[i] > 0) || !(points[i].degrees_of_freedom > 0)) {
      return unusable("bound of the mean-variance line, level " + std::to_string(i + 1) +
                      ": found variance " + to_text(model[i]) + ", degrees of freedom " +
                      to_text(points[i].degrees_of_freedom) + ", expected both above 0");
    }
  }
  const Result<Line> bound = reweighted(points, model);
  if (!bound) return bound.error();
  VarianceLine line;
  line.intercept = intercept;
  line.slope = slope;
  line.degrees_of_freedom = static_cast<double>(points.size()) - 2;
  line.converged = true;
  adopt_covariance(line, *bound);
  return line;
}

}  // namespace evenfield
