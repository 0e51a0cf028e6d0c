#pragma once
/// The quantities of one region, in the order of reports, put together from what the methods found.

#include <vector>

#include "analyse/dark_current.h"
#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/nonuniformity.h"
#include "analyse/response.h"

namespace evenfield {

std::vector<Quantity> region_quantities(const RegionLevels& levels,
                                        const GainAndNoise& gain,
                                        const Response& response,
                                        const Nonuniformity& pattern,
                                        const DarkCurrent& dark_current);

}  // namespace evenfield
