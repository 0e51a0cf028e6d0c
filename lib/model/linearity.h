#pragma once
/// Linearity error after EMVA 1288 R3.1 (from memory; METHODS 4): line y = a0 + a1 H through the levels
/// between 5 and 95 % of saturation, weighted 1/y^2; LE is the mean of |deviation from the line| in per cent
/// of the line.

#include <span>
#include <vector>

#include "base/error.h"

namespace evenfield {

struct ResponsePoint {
  double exposure = 0;  ///< H, any unit: exposure time x light
  double signal = 0;    ///< y, mean less dark mean [DN], > 0
};

struct Linearity {
  double intercept = 0;                    ///< a0 [DN]
  double slope = 0;                        ///< a1 [DN per unit of H]
  std::vector<double> deviations_percent;  ///< of the points of the fit, in their order
  double error_percent = 0;                ///< LE
  double peak_percent = 0;                 ///< largest |deviation|

  double at(double exposure) const { return intercept + slope * exposure; }
  /// Deviation of any level, inside the fitted range or not.
  double deviation_percent(ResponsePoint point) const {
    return 100.0 * (point.signal - at(point.exposure)) / at(point.exposure);
  }
};

/// The points of the range only; at least 3. Error `input` for a signal that is not > 0, a value that is not
/// finite, or a line that is not > 0 at a point.
Result<Linearity> fit_linearity(std::span<const ResponsePoint> points);

/// LE that pure noise of this relative standard uncertainty per level would show: sqrt(2/pi) x u, in per
/// cent.
double linearity_floor_percent(double relative_uncertainty);

}  // namespace evenfield
