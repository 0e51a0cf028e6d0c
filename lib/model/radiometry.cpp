#include "model/radiometry.h"

namespace evenfield {
namespace {

constexpr double kMetrePerMicrometre = 1e-6;
constexpr double kMetrePerNanometre = 1e-9;
constexpr double kMicrometrePerNanometre = 1e-3;

}  // namespace

double photons_per_joule_metre() { return 1 / (kPlanckJouleSecond * kLightSpeedMetrePerSecond); }

double photon_energy_ev_um() {
  return kPlanckJouleSecond * kLightSpeedMetrePerSecond / kElementaryChargeCoulomb / kMetrePerMicrometre;
}

double photons_per_pixel(double pixel_pitch_um,
                         double wavelength_nm,
                         double irradiance_w_per_m2,
                         double exposure_s) {
  const double pitch_m = pixel_pitch_um * kMetrePerMicrometre;
  const double energy_j = irradiance_w_per_m2 * pitch_m * pitch_m * exposure_s;
  return energy_j * wavelength_nm * kMetrePerNanometre * photons_per_joule_metre();
}

double responsivity_a_per_w(double quantum_efficiency, double wavelength_nm) {
  return quantum_efficiency * wavelength_nm * kMicrometrePerNanometre / photon_energy_ev_um();
}

}  // namespace evenfield
