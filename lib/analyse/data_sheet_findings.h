#pragma once
/// Findings about the quantities that follow from others: what limits the range, what neighbours share, what
/// a regulated offset hides, light that cannot be.

#include <vector>

#include "analyse/data_sheet_quantities.h"
#include "result/characterization.h"

namespace evenfield {

/// `rows[s]` is the index of series s in Characterization::series.
std::vector<Finding> data_sheet_findings(const RegionLevels& levels,
                                         const GainAndNoise& gain,
                                         const DarkCurrent& dark,
                                         const Response& response,
                                         const DataSheet& sheet,
                                         const std::vector<int>& rows);

/// The dark means show less dark current than the variances by so much that the camera must regulate its dark
/// level.
bool offset_is_regulated(const GainAndNoise& gain, const DarkCurrent& dark);

}  // namespace evenfield
