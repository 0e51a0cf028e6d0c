#pragma once
/// DSNU and PRNU of one region: spatial variance of the mean dark and flat frame, temporal noise taken out
/// (model/spatial.h). The pattern is that of the sensor at hand, so that temporal noise alone makes the
/// numbers uncertain.

#include <optional>
#include <string>

#include "analyse/levels.h"

namespace evenfield {

/// A spatial variance with its standard uncertainty [DN^2].
struct SpatialEstimate {
  double square = 0;
  double square_uncertainty = 0;
  std::size_t series = 0;
};

struct Nonuniformity {
  std::optional<SpatialEstimate> dark;  ///< DSNU^2: darks of most frames, the shortest of them
  std::string dark_reason;
  std::optional<SpatialEstimate>
      light;  ///< of the unsaturated flat nearest half of the range top, its dark's taken off
  std::size_t light_dark_series = 0;  ///< whose pattern was taken off
  /// The same for what needs a second look: the darks of DSNU where either serves, which spares a look.
  std::size_t light_high_pass_dark_series = 0;
  double light_signal_dn = 0;
  double light_signal_uncertainty_dn = 0;
  std::string light_reason;
};

Nonuniformity find_nonuniformity(const RegionLevels& levels);

}  // namespace evenfield
