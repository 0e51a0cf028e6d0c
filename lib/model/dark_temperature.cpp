#include "model/dark_temperature.h"

#include <cmath>
#include <numbers>

#include "model/radiometry.h"

namespace evenfield {
namespace {

/// As the source of the silicon model has it: its constants were fitted with this value.
constexpr double kSiliconModelBoltzmann = 8.62e-5;
constexpr double kLowestSiliconTemperature = 50;
constexpr double kHighestSiliconTemperature = 400;

/// 1/T2 - 1/T1 [1/K]; absent for temperatures that give no energy.
std::optional<double> difference_of_inverses(double temperature_1_k, double temperature_2_k) {
  if (!(temperature_1_k > 0) || !(temperature_2_k > 0) || temperature_1_k == temperature_2_k)
    return std::nullopt;
  return 1 / temperature_2_k - 1 / temperature_1_k;
}

double silicon_log_rate(double temperature_k) {
  return 1.5 * std::log(temperature_k) -
         silicon_gap_ev(temperature_k) / (2 * kSiliconModelBoltzmann * temperature_k);
}

}  // namespace

double arrhenius_ratio(double activation_ev, double from_k, double to_k) {
  return std::exp(activation_ev / kBoltzmannElectronVoltPerKelvin * (1 / from_k - 1 / to_k));
}

std::optional<double> activation_energy_ev(double rate_1,
                                           double temperature_1_k,
                                           double rate_2,
                                           double temperature_2_k) {
  const auto inverses = difference_of_inverses(temperature_1_k, temperature_2_k);
  if (!inverses || !(rate_1 > 0) || !(rate_2 > 0)) return std::nullopt;
  return kBoltzmannElectronVoltPerKelvin * std::log(rate_1 / rate_2) / *inverses;
}

std::optional<double> activation_energy_uncertainty_ev(double relative_uncertainty_1,
                                                       double temperature_1_k,
                                                       double relative_uncertainty_2,
                                                       double temperature_2_k) {
  const auto inverses = difference_of_inverses(temperature_1_k, temperature_2_k);
  if (!inverses) return std::nullopt;
  return kBoltzmannElectronVoltPerKelvin * std::hypot(relative_uncertainty_1, relative_uncertainty_2) /
         std::abs(*inverses);
}

std::optional<double> doubling_step_k(double activation_ev, double temperature_k) {
  if (!(temperature_k > 0) || !(activation_ev > 0)) return std::nullopt;
  const double inverse =
      1 / temperature_k - kBoltzmannElectronVoltPerKelvin * std::numbers::ln2 / activation_ev;
  if (!(inverse > 0)) return std::nullopt;
  return 1 / inverse - temperature_k;
}

double local_doubling_step_k(double activation_ev, double temperature_k) {
  return std::numbers::ln2 * kBoltzmannElectronVoltPerKelvin * temperature_k * temperature_k / activation_ev;
}

double silicon_gap_ev(double temperature_k) {
  return 1.1557 - 7.021e-4 * temperature_k * temperature_k / (1108 + temperature_k);
}

double silicon_dark_ratio(double temperature_k, double reference_k) {
  return std::exp(silicon_log_rate(temperature_k) - silicon_log_rate(reference_k));
}

std::optional<double> silicon_doubling_step_k(double temperature_k) {
  if (!(temperature_k >= kLowestSiliconTemperature) || !(temperature_k <= kHighestSiliconTemperature))
    return std::nullopt;
  // The logarithm of the rate rises everywhere, faster when cold: between 0 and 40 K of warming it passes
  // ln 2, at 50 K as at 400 K.
  const double wanted = silicon_log_rate(temperature_k) + std::numbers::ln2;
  double low = 0, high = 40;
  for (int halving = 0; halving < 60; ++halving) {
    const double middle = (low + high) / 2;
    (silicon_log_rate(temperature_k + middle) < wanted ? low : high) = middle;
  }
  return (low + high) / 2;
}

}  // namespace evenfield
