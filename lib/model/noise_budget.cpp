#include "model/noise_budget.h"

#include <cmath>
#include <numbers>

namespace evenfield {

double dark_noise_dn(double gain_dn_per_e, double read_noise_e, double quantization_dn2) {
  const double read_noise_dn = gain_dn_per_e * read_noise_e;
  return std::sqrt(read_noise_dn * read_noise_dn + quantization_dn2);
}

double signal_to_noise(double signal_e, double dark_noise_e) {
  return total_signal_to_noise(signal_e, dark_noise_e, 0, 0);
}

double total_signal_to_noise(double signal_e, double dark_noise_e, double dsnu_e, double prnu) {
  const double pattern_e = prnu * signal_e;
  return signal_e /
         std::sqrt(dark_noise_e * dark_noise_e + signal_e + dsnu_e * dsnu_e + pattern_e * pattern_e);
}

double threshold_e(double dark_noise_e) { return dark_noise_e + 0.5; }

double exact_threshold_e(double dark_noise_e) { return std::sqrt(dark_noise_e * dark_noise_e + 0.25) + 0.5; }

double dynamic_range(double saturation_e, double dark_noise_e) {
  return saturation_e / threshold_e(dark_noise_e);
}

double dynamic_range_relative_uncertainty(double saturation_relative_uncertainty,
                                          double dark_noise_relative_uncertainty,
                                          double dark_noise_e) {
  const double share = dark_noise_e / threshold_e(dark_noise_e);
  return std::hypot(saturation_relative_uncertainty, share * dark_noise_relative_uncertainty);
}

double maximum_signal_to_noise(double saturation_e) { return std::sqrt(saturation_e); }

double decibels(double ratio) { return 20 * std::log10(ratio); }

double decibel_uncertainty(double relative_uncertainty) {
  return 20 / std::numbers::ln10 * relative_uncertainty;
}

double bits(double ratio) { return std::log2(ratio); }

}  // namespace evenfield
