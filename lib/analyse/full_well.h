#pragma once
/// Where the charge of a pixel ends, and where its response leaves the line. Signals in DN above the dark.
///
/// Full well: where the temporal variance falls below its running maximum by three of its standard
/// uncertainties (photon transfer turn-off; common practice, no source) and pixels do not sit at the top
/// code, the highest signal that is reached; else the converter is the limit. Linear full well: from half of
/// the range top upward the first crossing of 1 % from the line of the linearity error, interpolated (common
/// practice, no source).

#include <optional>
#include <string>

#include "analyse/levels.h"
#include "analyse/quantities.h"
#include "analyse/response.h"

namespace evenfield {

inline constexpr double kLinearFullWellPercent = 1.0;

struct FullWell {
  std::optional<Estimate> charge_dn;
  std::string charge_reason;
  bool converter_limited = false;
  std::optional<double> charge_low95_dn;      ///< where the variance never turns down
  std::optional<double> variance_maximum_dn;  ///< signal of the largest variance
  std::optional<Estimate> linear_dn;
  std::string linear_reason;
  std::optional<double> linear_low95_dn;
};

FullWell find_full_well(const RegionLevels& levels, const Response& response);

}  // namespace evenfield
