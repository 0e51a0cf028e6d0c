#include "analyse/response.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <set>

#include "base/text.h"
#include "model/line_fit.h"

namespace evenfield {
namespace {

constexpr int kFewestLevels = 3;

/// Uncertainty of LE: each signal is moved by its own uncertainty and the error computed again; the moves add
/// in squares.
double propagated(const std::vector<ResponsePoint>& points,
                  const std::vector<double>& uncertainty,
                  double error_percent) {
  double squares = 0;
  for (std::size_t i = 0; i < points.size(); ++i) {
    if (uncertainty[i] <= 0) continue;
    std::vector<ResponsePoint> moved = points;
    moved[i].signal += uncertainty[i];
    if (const auto line = fit_linearity(moved)) squares += std::pow(line->error_percent - error_percent, 2);
  }
  return std::sqrt(squares);
}

}  // namespace

std::optional<double> axis_of(const RegionLevels& levels, const Level& level) {
  const Conditions& conditions = levels.input().series[level.series].conditions;
  if (!conditions.exposure_s) return std::nullopt;
  return *conditions.exposure_s * conditions.light;
}

Response find_response(const RegionLevels& levels) {
  Response out;
  if (levels.levels().empty()) {
    out.reason = "needs flats and matching darks";
    return out;
  }
  std::vector<ResponsePoint> points;
  bool without_exposure = false;
  for (std::size_t i = 0; i < levels.levels().size(); ++i) {
    const Level& level = levels.levels()[i];
    if (levels.saturated(level) || level.signal < kLinearityLow * levels.top().signal_dn ||
        level.signal > kLinearityHigh * levels.top().signal_dn)
      continue;
    const auto axis = axis_of(levels, level);
    if (!axis) {
      without_exposure = true;
      continue;
    }
    points.push_back({*axis, level.signal});
    out.levels.push_back(i);
  }
  if (static_cast<int>(points.size()) < kFewestLevels) {
    out.levels.clear();
    out.reason = without_exposure
                     ? "needs exposure_s of the flats"
                     : "needs three levels or more between 5 and 95 % of the range top; there are " +
                           std::to_string(points.size());
    return out;
  }
  if (std::all_of(points.begin(), points.end(),
                  [&](const ResponsePoint& p) { return p.exposure == points.front().exposure; })) {
    out.levels.clear();
    out.reason = "needs levels of different exposure_s x light; all have the same";
    return out;
  }
  const auto line = fit_linearity(points);
  if (!line) {
    out.levels.clear();
    out.reason = "no line fits the response: a signal or what the line says of it is not above 0";
    return out;
  }
  if (!(line->slope > 0)) {
    out.levels.clear();
    out.reason = "the signal does not rise with exposure_s x light";
    return out;
  }
  out.line = *line;
  std::vector<double> statistical;
  std::vector<double> common;
  double relative = 0;
  for (std::size_t i = 0; i < points.size(); ++i) {
    const Level& level = levels.levels()[out.levels[i]];
    double dark = 0;
    for (const auto& [series, weight] : level.dark.mean)
      dark += std::pow(weight * levels.mean_uncertainty(series), 2);
    const double flat = levels.mean_uncertainty(level.series);
    statistical.push_back(std::sqrt(flat * flat + dark));
    common.push_back(points[i].signal * levels.input().level_relative_uncertainty);
    relative += std::pow(std::hypot(statistical.back(), common.back()) / points[i].signal, 2);
  }
  out.uncertainty_dn = statistical;
  out.common_dn = common;
  out.error_percent = Estimate{line->error_percent, propagated(points, statistical, line->error_percent),
                               propagated(points, common, line->error_percent), std::nullopt};
  out.floor_percent = linearity_floor_percent(std::sqrt(relative / static_cast<double>(points.size())));
  out.note = std::to_string(points.size()) + " levels; noise of light and camera alone would show " +
             to_text(out.floor_percent, 2) + " %; camera and lamp are not told apart";
  return out;
}

namespace {

/// Signals y at light l and exposure t: y = a l t + b l, weighted 1/y^2; b / a.
std::optional<double> offset_of(const std::vector<std::array<double, 3>>& points) {
  Matrix regressors(static_cast<int>(points.size()), 2);
  std::vector<double> y;
  std::vector<double> weights;
  for (int i = 0; i < regressors.rows; ++i) {
    const auto& [light, exposure, signal] = points[static_cast<std::size_t>(i)];
    regressors(i, 0) = light * exposure;
    regressors(i, 1) = light;
    y.push_back(signal);
    weights.push_back(1 / (signal * signal));
  }
  const auto fit = fit_linear_model(regressors, y, weights);
  if (!fit || !(fit->coefficients[0] > 0)) return std::nullopt;
  return fit->coefficients[1] / fit->coefficients[0];
}

}  // namespace

ShutterOffset find_shutter_offset(const RegionLevels& levels, const Response& response) {
  ShutterOffset out;
  if (!response.line) {
    out.reason = response.reason;
    return out;
  }
  std::vector<std::array<double, 3>> points;  // light, exposure, signal
  std::set<double> exposures;
  for (const std::size_t i : response.levels) {
    const Level& level = levels.levels()[i];
    const Conditions& conditions = levels.input().series[level.series].conditions;
    points.push_back({conditions.light, *conditions.exposure_s, level.signal});
    exposures.insert(*conditions.exposure_s);
  }
  constexpr std::size_t kFewestExposures = 3;
  if (exposures.size() < kFewestExposures) {
    out.reason = "needs three different exposures or more between 5 and 95 % of the range top";
    return out;
  }
  const auto offset = offset_of(points);
  if (!offset) {
    out.reason = "no line fits the response";
    return out;
  }
  const auto propagate = [&](const std::vector<double>& uncertainty) {
    double squares = 0;
    for (std::size_t i = 0; i < points.size(); ++i) {
      auto moved = points;
      moved[i][2] += uncertainty[i];
      if (const auto value = offset_of(moved)) squares += std::pow(*value - *offset, 2);
    }
    return std::sqrt(squares);
  };
  out.seconds =
      Estimate{*offset, propagate(response.uncertainty_dn), propagate(response.common_dn), std::nullopt};
  if (!(out.seconds->statistical_uncertainty > 0)) {
    out.seconds.reset();
    out.reason = "the frames show no noise, so nothing is known of the uncertainty";
  }
  return out;
}

}  // namespace evenfield
