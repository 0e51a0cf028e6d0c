#include "model/gain_bias.h"

#include <cmath>

namespace evenfield {

double flicker_variance_excess(double relative_rms, double signal_e) {
  return relative_rms * relative_rms * signal_e;
}

double compressed_gain_ratio(double compression) {
  const double slope = 1 - 2 * compression;  // of the response, which the noise sees squared
  return slope * slope / (1 - compression);
}

double origin_line_inefficiency(std::span<const double> levels) {
  double squares = 0, fourths = 0;
  for (const double x : levels) {
    squares += x * x;
    fourths += x * x * x * x;
  }
  return std::sqrt(static_cast<double>(levels.size()) * fourths) / squares;
}

}  // namespace evenfield
