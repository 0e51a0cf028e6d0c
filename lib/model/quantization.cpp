#include "model/quantization.h"

#include <cmath>
#include <numbers>

namespace evenfield {
namespace {

using std::numbers::pi;

/// Above this spread the series needs few terms; below it few codes occur and their shares are summed.
constexpr double kSeriesSpread = 0.5;

double share_below(double x, double mean, double spread) {
  return 0.5 * std::erfc((mean - x) / (spread * std::numbers::sqrt2));
}

RoundedNormal by_codes(double mean, double spread) {
  const double centre = std::round(mean);
  const int reach = static_cast<int>(std::ceil(10 * spread)) + 1;
  double first = 0, second = 0;
  for (int offset = -reach; offset <= reach; ++offset) {
    const double share =
        share_below(centre + offset + 0.5, mean, spread) - share_below(centre + offset - 0.5, mean, spread);
    first += share * offset;
    second += share * offset * offset;
  }
  return {centre + first, second - first * first};
}

RoundedNormal by_series(double mean, double spread) {
  double bias = 0, excess = 0;
  const double phase = 2 * pi * (mean - std::round(mean));
  for (int k = 1; k <= 8; ++k) {
    const double sign = k % 2 == 0 ? 1.0 : -1.0;
    const double decay = std::exp(-2 * pi * pi * k * k * spread * spread);
    bias += sign / (pi * k) * decay * std::sin(phase * k);
    excess += sign * (4 * spread * spread + 1 / (pi * pi * k * k)) * decay * std::cos(phase * k);
  }
  return {mean + bias, spread * spread + quantization_variance(1) + excess - bias * bias};
}

}  // namespace

RoundedNormal rounded_normal(double mean, double standard_deviation) {
  if (!(standard_deviation > 0)) return {std::round(mean), 0.0};
  return standard_deviation < kSeriesSpread ? by_codes(mean, standard_deviation)
                                            : by_series(mean, standard_deviation);
}

double unresolved_noise_limit(double step_dn) {
  return step_dn * std::sqrt(kUnresolvedVariance - quantization_variance(1));
}

double unresolved_noise_limit_with_rounding(double step_dn) {
  return step_dn * std::sqrt(kUnresolvedVariance);
}

}  // namespace evenfield
