#pragma once
/// Response to photons, where the session says how many there were: responsivity is the slope of signal
/// against photons over the levels of the gain, unweighted through the origin as EMVA 1288 has it (from
/// memory); quantum efficiency is responsivity over gain, of the whole pixel area.

#include <optional>
#include <string>

#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/quantities.h"

namespace evenfield {

struct Efficiency {
  std::optional<Estimate> dn_per_photon;
  std::optional<Estimate> percent;  ///< quantum efficiency
  std::string reason;
  std::optional<double> wavelength_nm;
};

Efficiency find_efficiency(const RegionLevels& levels, const GainAndNoise& gain);

}  // namespace evenfield
