#pragma once
/// Which levels and darks give gain and read noise. Part of gain.cpp.

#include <vector>

#include "analyse/gain.h"

namespace evenfield {

/// Picks the levels of the fits and their darks, or says why there are none.
void plan_gain(const RegionLevels& levels, GainAndNoise& out);

/// Which darks give the read noise. `gain` [DN/e-] tells how much of their variance is dark current.
SeriesWeights plan_noise(const RegionLevels& levels, double gain, GainAndNoise& out);

/// Whether rows share so much noise that bands of them have to be resampled, not blocks.
bool rows_are_correlated(const RegionLevels& levels, const std::vector<std::size_t>& series);

}  // namespace evenfield
