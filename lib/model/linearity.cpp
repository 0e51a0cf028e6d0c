#include "model/linearity.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string>

#include "base/text.h"
#include "model/line_fit.h"

namespace evenfield {

Result<Linearity> fit_linearity(std::span<const ResponsePoint> points) {
  if (points.size() < 3) {
    return Error{
        Errc::input,
        {},
        "linearity: found " + std::to_string(points.size()) + " levels in range, expected at least 3"};
  }
  std::vector<LinePoint> weighted;
  for (std::size_t i = 0; i < points.size(); ++i) {
    const ResponsePoint& point = points[i];
    if (!std::isfinite(point.exposure) || !std::isfinite(point.signal) || point.signal <= 0) {
      return Error{Errc::input,
                   {},
                   "linearity, level " + std::to_string(i + 1) + ": found exposure " +
                       to_text(point.exposure) + ", signal " + to_text(point.signal) +
                       ", expected finite numbers, the signal above 0"};
    }
    weighted.push_back({point.exposure, point.signal, 1 / (point.signal * point.signal)});
  }
  const Result<Line> line = fit_line(weighted);
  if (!line) return line.error();

  Linearity linearity;
  linearity.intercept = line->intercept;
  linearity.slope = line->slope;
  double sum = 0;
  for (std::size_t i = 0; i < points.size(); ++i) {
    if (!(linearity.at(points[i].exposure) > 0)) {
      return Error{Errc::input,
                   {},
                   "linearity, level " + std::to_string(i + 1) + ": found the fitted line at " +
                       to_text(linearity.at(points[i].exposure)) + ", expected it above 0"};
    }
    const double deviation = linearity.deviation_percent(points[i]);
    linearity.deviations_percent.push_back(deviation);
    linearity.peak_percent = std::max(linearity.peak_percent, std::abs(deviation));
    sum += std::abs(deviation);
  }
  linearity.error_percent = sum / static_cast<double>(points.size());
  return linearity;
}

double linearity_floor_percent(double relative_uncertainty) {
  return 100 * std::sqrt(2 / std::numbers::pi) * relative_uncertainty;
}

}  // namespace evenfield
