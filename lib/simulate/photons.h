#pragma once
/// Light as a stream of photons.

namespace evenfield {

/// Photons per second on a square pixel of `pitch_um` micrometres a side under `irradiance_w_per_m2` of light
/// of `wavelength_nm`:  E x area / (h c / wavelength), with the exact h and c of the SI (2019).
constexpr double photons_per_s(double wavelength_nm, double pitch_um, double irradiance_w_per_m2) {
  constexpr double kPlanckJs = 6.62607015e-34;
  constexpr double kLightMPerS = 299792458.0;
  const double photon_j = kPlanckJs * kLightMPerS / (wavelength_nm * 1e-9);
  return irradiance_w_per_m2 * (pitch_um * 1e-6) * (pitch_um * 1e-6) / photon_j;
}

}  // namespace evenfield
