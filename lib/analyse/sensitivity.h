#pragma once
/// What a region can see: dark noise, signal at a ratio of one, dynamic range and largest ratio, after EMVA
/// 1288 chapter 2 (from memory; model/noise_budget.h). All noises with quantization.

#include <optional>
#include <string>

#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/quantities.h"

namespace evenfield {

struct Sensitivity {
  std::optional<Estimate> dark_noise_dn, dark_noise_e;  ///< sigma_y.dark of the darks behind read noise
  std::optional<Estimate> threshold_e;                  ///< sigma_y.dark / K + 1/2
  std::optional<double> exact_threshold_e;
  std::optional<Estimate> dynamic_range;  ///< ratio: saturation over threshold
  std::optional<Estimate> snr_max;        ///< ratio: square root of the saturation capacity
  std::optional<double> dynamic_range_low95, snr_max_low95;  ///< where the session does not saturate
  std::string noise_reason, range_reason;                    ///< why there is none
};

Sensitivity find_sensitivity(const RegionLevels& levels, const GainAndNoise& gain);

/// Why the top of the range has no value: it was not reached, or lies below all levels; empty if it has one.
std::string no_saturation_reason(const RegionLevels& levels);

}  // namespace evenfield
