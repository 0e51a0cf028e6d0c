#include "analyse/efficiency.h"

#include <algorithm>
#include <cmath>

namespace evenfield {

Efficiency find_efficiency(const RegionLevels& levels, const GainAndNoise& gain) {
  Efficiency out;
  const AnalysisInput& input = levels.input();
  if (!input.has_light) {
    out.reason = "needs [light] with wavelength_nm and irradiance_w_per_m2, and camera.pixel_pitch_um";
    return out;
  }
  if (gain.gain_levels.empty()) {
    out.reason = gain.gain_reason;
    return out;
  }
  double square = 0;
  double cross = 0;
  double noise = 0;
  double common = 0;
  for (const std::size_t i : gain.gain_levels) {
    const Level& level = levels.levels()[i];
    const SeriesInput& series = input.series[level.series];
    if (!series.photons || !series.wavelength_nm) {
      out.reason =
          "needs the photons of every level: wavelength_nm, irradiance_w_per_m2, pixel_pitch_um and "
          "exposure_s";
      return out;
    }
    if (out.wavelength_nm && *out.wavelength_nm != *series.wavelength_nm) {
      out.reason = "the levels have different wavelengths; measure one at a time";
      return out;
    }
    out.wavelength_nm = series.wavelength_nm;
    const double p = *series.photons;
    square += p * p;
    cross += p * level.signal;
    double dark = 0;
    for (const auto& [s, weight] : level.dark.mean) dark += std::pow(weight * levels.mean_uncertainty(s), 2);
    noise += p * p * (std::pow(levels.mean_uncertainty(level.series), 2) + dark);
    common += std::pow(p * level.signal * input.level_relative_uncertainty, 2);
  }
  if (!(square > 0)) {
    out.reason = "the session states no light: irradiance_w_per_m2 or exposures are 0";
    return out;
  }
  if (!(cross > 0)) {
    out.reason = "the signal does not rise with the photons";
    return out;
  }
  const double slope = cross / square;
  // What levels scatter about the line counts where it is more than their own uncertainty.
  double residual = 0;
  for (const std::size_t i : gain.gain_levels) {
    const Level& level = levels.levels()[i];
    residual += std::pow(level.signal - slope * *input.series[level.series].photons, 2);
  }
  const double levels_left = static_cast<double>(gain.gain_levels.size()) - 1;
  const double scatter = levels_left > 0 ? residual / levels_left * square : 0.0;
  noise = std::max(noise, scatter);
  const double relative_common = std::hypot(std::sqrt(common) / cross, input.irradiance_relative_uncertainty);
  out.dn_per_photon = Estimate{slope, std::sqrt(noise) / square, slope * relative_common, std::nullopt};
  if (!gain.gain) {
    out.reason = "needs the conversion gain: " + gain.gain_reason;
    return out;
  }
  const double percent = 100 * slope / gain.gain->value;
  const double relative = std::hypot(out.dn_per_photon->statistical_uncertainty / slope,
                                     gain.gain->statistical_uncertainty / gain.gain->value);
  out.percent =
      Estimate{percent, percent * relative, percent * relative_common, gain.gain->degrees_of_freedom};
  return out;
}

}  // namespace evenfield
