#pragma once
/// Photons per pixel from irradiance. Constants are exact in the SI since 2019. Source: METHODS 3.3.

namespace evenfield {

constexpr double kPlanckJouleSecond = 6.62607015e-34;
constexpr double kLightSpeedMetrePerSecond = 299792458.0;
constexpr double kElementaryChargeCoulomb = 1.602176634e-19;
constexpr double kBoltzmannJoulePerKelvin = 1.380649e-23;
constexpr double kBoltzmannElectronVoltPerKelvin = kBoltzmannJoulePerKelvin / kElementaryChargeCoulomb;

/// 1 / (h c) [1/(J m)]: photons per joule and metre of wavelength.
double photons_per_joule_metre();
/// h c / e [eV um]: photon energy times wavelength.
double photon_energy_ev_um();

/// Mean photons per pixel = A E t lambda / (h c), A = pitch^2.
double photons_per_pixel(double pixel_pitch_um,
                         double wavelength_nm,
                         double irradiance_w_per_m2,
                         double exposure_s);

/// Spectral responsivity [A/W] of this quantum efficiency (1 = every photon).
double responsivity_a_per_w(double quantum_efficiency, double wavelength_nm);

}  // namespace evenfield
