#include "analyse/sensitivity.h"

#include <cmath>

#include "model/noise_budget.h"
#include "model/student.h"

namespace evenfield {
namespace {

/// sigma_y.dark in DN and in electrons, and the threshold.
void find_dark_noise(const RegionLevels& levels, const GainAndNoise& gain, Sensitivity& out) {
  if (!gain.read_noise_dn) {
    out.noise_reason = gain.read_noise_reason;
    return;
  }
  const double noise = std::sqrt(levels.dark_variance(gain.noise_dark));
  const Estimate& read = *gain.read_noise_dn;
  // sigma^2 = r^2 + q, q exact.
  const double uncertainty = read.value * read.statistical_uncertainty / noise;
  out.dark_noise_dn = Estimate{noise, uncertainty, 0.0, read.degrees_of_freedom};
  if (!gain.gain) {
    out.noise_reason = "needs the conversion gain: " + gain.gain_reason;
    return;
  }
  const Estimate& k = *gain.gain;
  const double a = uncertainty / noise;
  const double b = k.statistical_uncertainty / k.value;
  const double correlation = gain.correlation("conversion_gain_dn_per_e", "read_noise_dn").value_or(0.0);
  const double relative = std::sqrt(std::max(0.0, a * a + b * b - 2 * a * b * correlation));
  const double noise_e = noise / k.value;
  out.dark_noise_e = Estimate{noise_e, noise_e * relative, 0.0, read.degrees_of_freedom};
  out.threshold_e = Estimate{threshold_e(noise_e), noise_e * relative, 0.0, read.degrees_of_freedom};
  out.exact_threshold_e = exact_threshold_e(noise_e);
}

}  // namespace

std::string no_saturation_reason(const RegionLevels& levels) {
  if (levels.levels().empty()) return "needs flats and matching darks";
  if (!levels.top().unresolved.empty())
    return "saturation has no value: " + levels.top().unresolved.substr(0, levels.top().unresolved.find(';'));
  if (!levels.top().saturates)
    return "the session does not saturate; the lower limit is that of the brightest level";
  return "";
}

Sensitivity find_sensitivity(const RegionLevels& levels, const GainAndNoise& gain) {
  Sensitivity out;
  find_dark_noise(levels, gain, out);
  out.range_reason = no_saturation_reason(levels);
  if (!gain.gain) {
    if (out.range_reason.empty()) out.range_reason = "needs the conversion gain: " + gain.gain_reason;
    return out;
  }
  const RangeTop& top = levels.top();
  const bool bounded = !top.saturates && top.signal_dn > 0;
  if (!out.range_reason.empty() && !bounded) return out;
  const Estimate& k = *gain.gain;
  const double capacity = top.signal_dn / k.value;
  const double capacity_relative =
      std::hypot(top.uncertainty_dn / top.signal_dn, k.statistical_uncertainty / k.value);
  const double one_sided = student_quantile(0.95, k.degrees_of_freedom);
  const double snr = maximum_signal_to_noise(capacity);
  if (bounded)
    out.snr_max_low95 = snr * (1 - one_sided * capacity_relative / 2);
  else
    out.snr_max = Estimate{snr, snr * capacity_relative / 2, 0.0, k.degrees_of_freedom};
  if (!out.dark_noise_dn) {
    if (out.range_reason.empty()) out.range_reason = out.noise_reason;
    return out;
  }
  const double noise_e = out.dark_noise_dn->value / k.value;
  const double ratio = dynamic_range(capacity, noise_e);
  const double relative = dynamic_range_relative_uncertainty(
      top.uncertainty_dn / top.signal_dn,
      out.dark_noise_dn->statistical_uncertainty / out.dark_noise_dn->value, noise_e);
  if (bounded)
    out.dynamic_range_low95 = ratio * (1 - one_sided * relative);
  else
    out.dynamic_range = Estimate{ratio, ratio * relative, 0.0, k.degrees_of_freedom};
  return out;
}

}  // namespace evenfield
