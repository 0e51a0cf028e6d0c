#pragma once
/// What the session shows of itself that its owner should know, with the numbers seen and what to do about
/// it.

#include <vector>

#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/response.h"

namespace evenfield {

/// Of the whole session: bit depth, copies of frames, noise that is missing.
std::vector<Finding> session_findings(const AnalysisInput& input, const Codes& codes);

/// Of one region. `rows[s]` is the index of series s in Characterization::series.
std::vector<Finding> region_findings(const RegionLevels& levels,
                                     const GainAndNoise& gain,
                                     const Response& response,
                                     const std::vector<int>& rows);

}  // namespace evenfield
