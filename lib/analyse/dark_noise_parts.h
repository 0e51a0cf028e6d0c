#pragma once
/// Parts of the temporal noise in the dark: what the pixels of a row share and what a frame shares. Of the
/// series behind read noise, the one of most frames. METHODS 5.2.

#include <optional>
#include <string>

#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/nonuniformity.h"

namespace evenfield {

struct DarkNoiseParts {
  std::optional<SpatialEstimate> row;    ///< [DN^2]
  std::optional<SpatialEstimate> frame;  ///< [DN^2]
  std::string row_reason, frame_reason;
};

/// Of the darks of the shortest exposure, the series of most frames; needs two.
std::optional<std::size_t> noise_series(const RegionLevels& levels);

DarkNoiseParts find_dark_noise_parts(const RegionLevels& levels);

}  // namespace evenfield
