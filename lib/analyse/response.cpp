#include "analyse/response.h"

#include <algorithm>
#include <cmath>

#include "base/text.h"

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
    out.reason = "no line fits the response: " + line.error().what;
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
  out.error_percent = Estimate{line->error_percent, propagated(points, statistical, line->error_percent),
                               propagated(points, common, line->error_percent), std::nullopt};
  out.floor_percent = linearity_floor_percent(std::sqrt(relative / static_cast<double>(points.size())));
  out.note = std::to_string(points.size()) + " levels; noise of light and camera alone would show " +
             to_text(out.floor_percent, 2) + " %; camera and lamp are not told apart";
  return out;
}

}  // namespace evenfield
