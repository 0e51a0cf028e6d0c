#pragma once
/// Words and numbers of the quantities that follow from others: parts of the dark noise and of the patterns,
/// full well, what can be seen, dark current from variances, shutter offset, response to photons.

#include <vector>

#include "analyse/dark_current.h"
#include "analyse/dark_noise_parts.h"
#include "analyse/efficiency.h"
#include "analyse/full_well.h"
#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/nonuniformity.h"
#include "analyse/pattern_parts.h"
#include "analyse/response.h"
#include "analyse/sensitivity.h"
#include "result/characterization.h"

namespace evenfield {

struct DataSheet {
  DarkNoiseParts noise_parts;
  Nonuniformity nonuniformity;
  Patterns patterns;
  FullWell full_well;
  Sensitivity sensitivity;
  ShutterOffset shutter;
  Efficiency efficiency;
};

std::vector<Quantity> data_sheet_quantities(const RegionLevels& levels,
                                            const GainAndNoise& gain,
                                            const DarkCurrent& dark,
                                            const DataSheet& sheet);

}  // namespace evenfield
