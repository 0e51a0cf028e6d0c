#include "model/linearity.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "check_row.h"
#include "model/line_fit.h"

using namespace evenfield;

namespace {

// H = 1..10, y = 100 H (1 - 0.002 H).
const std::vector<ResponsePoint> kResponse{{1, 99.8},  {2, 199.2}, {3, 298.2}, {4, 396.8}, {5, 495},
                                           {6, 592.8}, {7, 690.2}, {8, 787.2}, {9, 883.8}, {10, 980}};
constexpr const char* kSource = "exact rational arithmetic; rule of EMVA 1288 R3.1 from memory";

}  // namespace

TEST_CASE("the linearity error of a slightly curved response") {
  const auto linearity = fit_linearity(kResponse);
  REQUIRE(linearity);
  const std::array rows{
      CheckRow{"LE-01", "LE [%]", linearity->error_percent, 0.3084329016, 1e-9, Mark::derived, kSource},
      CheckRow{"LE-02", "a0", linearity->intercept, 1.7757978284, 1e-9, Mark::derived, kSource},
      CheckRow{"LE-02", "a1", linearity->slope, 98.3775683543, 1e-9, Mark::derived, kSource},
      CheckRow{"LE-01", "largest deviation [%]", linearity->peak_percent, 0.563287, 1e-6, Mark::derived,
               kSource},
  };
  check_rows(rows);
  double over_signal = 0;  // the same residuals over the signal in place of the line
  for (const ResponsePoint& point : kResponse)
    over_signal += 10 * std::abs(point.signal - linearity->at(point.exposure)) / point.signal;
  const std::array others{
      CheckRow{"LE-01", "over the signal [%]", over_signal, 0.3085269447, 1e-9, Mark::derived, kSource}};
  check_rows(others);
  constexpr double kDeviations[] = {-0.352825, 0.337008,  0.434982,  0.382996,  0.270703,
                                    0.128165,  -0.031687, -0.202377, -0.380299, -0.563287};
  REQUIRE(linearity->deviations_percent.size() == std::size(kDeviations));
  for (std::size_t i = 0; i < std::size(kDeviations); ++i) {
    CAPTURE(i);
    CHECK(std::abs(linearity->deviations_percent[i] - kDeviations[i]) < 1e-6);
  }
}

TEST_CASE("the unweighted line through the same response is exact") {
  std::vector<LinePoint> points;
  for (const ResponsePoint& point : kResponse) points.push_back({point.exposure, point.signal});
  const auto line = fit_line(points);
  REQUIRE(line);
  double relative_sum = 0, largest = 0, smallest = 0;
  for (const LinePoint& point : points) {
    const double residual = point.y - line->at(point.x);
    relative_sum += std::abs(residual / line->at(point.x)) / static_cast<double>(points.size());
    largest = std::max(largest, residual);
    smallest = std::min(smallest, residual);
  }
  const std::array rows{
      CheckRow{"LE-03", "mean relative residual [%]", 100 * relative_sum, 0.4340648458, 1e-10, Mark::derived,
               kSource},
      CheckRow{"LE-03", "half the range of residuals [DN]", (largest - smallest) / 2, 2.0, 1e-11,
               Mark::derived, kSource},
      CheckRow{"LE-03", "a0", line->intercept, 4.4, 1e-11, Mark::derived, kSource},
      CheckRow{"LE-03", "a1", line->slope, 97.8, 1e-11, Mark::derived, kSource},
  };
  check_rows(rows);
}
