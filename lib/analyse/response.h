#pragma once
/// Response and linearity error of one region: signal against exposure x light, after EMVA 1288
/// (model/linearity.h).

#include <optional>
#include <string>
#include <vector>

#include "analyse/levels.h"
#include "analyse/quantities.h"
#include "model/linearity.h"

namespace evenfield {

inline constexpr double kLinearityLow = 0.05;  ///< of the range top
inline constexpr double kLinearityHigh = 0.95;

struct Response {
  std::optional<Linearity> line;
  std::vector<std::size_t> levels;  ///< indices into RegionLevels::levels() of the line's points
  std::vector<double> uncertainty_dn, common_dn;  ///< of the points' signals: statistical and common part
  std::optional<Estimate> error_percent;          ///< LE
  double floor_percent = 0;                       ///< what noise alone would show of it
  std::string reason;                             ///< why there is none
  std::string note;
};

/// exposure_s x light of a level, if its exposure is known.
std::optional<double> axis_of(const RegionLevels& levels, const Level& level);

Response find_response(const RegionLevels& levels);

/// Constant error of the exposure time: the light-collecting time is exposure_s + the offset. From the line
/// signal = a light (exposure + offset) through the levels of the linearity error, weighted alike.
struct ShutterOffset {
  std::optional<Estimate> seconds;
  std::string reason;  ///< why there is none
};
ShutterOffset find_shutter_offset(const RegionLevels& levels, const Response& response);

}  // namespace evenfield
