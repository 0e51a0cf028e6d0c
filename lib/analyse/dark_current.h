#pragma once
/// Dark current of one region from the means of darks of several exposures: slope of the straight line,
/// weighted by frames; and from their variances, slope of the line weighted by the variances' own
/// uncertainty. Its uncertainty is that of the sensor at hand: temporal noise and the scatter of the dark
/// level between frames.

#include <optional>
#include <string>
#include <vector>

#include "analyse/levels.h"
#include "analyse/quantities.h"

namespace evenfield {

struct DarkCurrent {
  std::optional<Estimate> dn_per_s;
  std::vector<std::size_t> series;  ///< the darks of the line
  double offset_dn = 0;             ///< the line at zero exposure
  std::string reason;               ///< why there is none
  std::string note;
  std::optional<double> temperature_c;
  std::optional<Estimate> variance_dn2_per_s;  ///< growth of the temporal variance of darks
  std::string variance_reason;
};

DarkCurrent find_dark_current(const RegionLevels& levels);

}  // namespace evenfield
