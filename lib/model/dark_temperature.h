#pragma once
/// Dark current against temperature. Rates in any unit, temperatures in K, energies in eV. What has no
/// answer (a rate or temperature that is not > 0) is absent or NaN as said. Source: METHODS 6.

#include <optional>

namespace evenfield {

constexpr double kKelvinAtZeroCelsius = 273.15;

/// Arrhenius law: rate(to) / rate(from) = exp(Ea/k (1/from - 1/to)). Temperatures > 0.
double arrhenius_ratio(double activation_ev, double from_k, double to_k);

/// Energy from two rates: k ln(I1/I2) / (1/T2 - 1/T1). Absent if a rate or temperature is not > 0 or the
/// temperatures are equal. Negative if the warmer sensor has the lower rate.
std::optional<double> activation_energy_ev(double rate_1,
                                           double temperature_1_k,
                                           double rate_2,
                                           double temperature_2_k);

/// Its standard uncertainty from independent relative ones of the rates; absent as above.
std::optional<double> activation_energy_uncertainty_ev(double relative_uncertainty_1,
                                                       double temperature_1_k,
                                                       double relative_uncertainty_2,
                                                       double temperature_2_k);

/// Warming [K] from `temperature_k` that doubles the rate: 1/(1/T - k ln2/Ea) - T. Absent unless Ea is
/// > k T ln 2: below, no warming doubles it.
std::optional<double> doubling_step_k(double activation_ev, double temperature_k);

/// ln2 k T^2/Ea, the step as the slope at T has it: shorter than the true one. Ea > 0.
double local_doubling_step_k(double activation_ev, double temperature_k);

/// Band gap of silicon: 1.1557 - 7.021e-4 T^2/(1108 + T). Source: Rajkanan et al. 1979.
double silicon_gap_ev(double temperature_k);

/// Rate of a silicon sensor over that at `reference_k` if generation in the depleted layer dominates:
/// T^1.5 exp(-Eg/(2kT)), normalised. Source: Janesick 2001 (from memory), with k = 8.62e-5 eV/K as there.
double silicon_dark_ratio(double temperature_k, double reference_k);

/// Warming [K] from `temperature_k` that doubles silicon_dark_ratio(); `temperature_k` from 50 to 400 K,
/// else absent: the gap model holds no further.
std::optional<double> silicon_doubling_step_k(double temperature_k);

}  // namespace evenfield
