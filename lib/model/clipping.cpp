#include "model/clipping.h"

#include <cmath>
#include <numbers>

#include "base/text.h"
#include "model/student.h"

namespace evenfield {
namespace {

double normal_density(double z) { return std::exp(-z * z / 2) / std::sqrt(2 * std::numbers::pi); }

}  // namespace

Result<double> mean_at_clipped_fraction(double top_code, double gain, double dark_variance, double fraction) {
  if (!(fraction > 0) || !(fraction < 0.5)) {
    return Error{Errc::input, {}, "clipped share: found " + to_text(fraction) + ", expected inside (0, 0.5)"};
  }
  const double z = normal_quantile(1 - fraction);
  const double edge = top_code - 0.5;
  // edge - m = z sqrt(b + K m), its root below the edge.
  const double half = z * gain / 2;
  const double root = half * half + gain * edge + dark_variance;
  const double mean = edge + z * half - z * std::sqrt(root);
  if (!(root >= 0) || mean > edge || !(dark_variance + gain * mean >= 0)) {
    return Error{Errc::input,
                 {},
                 "clipped share: found no level below code " + to_text(top_code) + " of gain " +
                     to_text(gain) + " and dark variance " + to_text(dark_variance) +
                     ", expected a positive variance there"};
  }
  return mean;
}

double clipped_mean_uncertainty(double fraction, double pixels, double sigma_dn) {
  return std::sqrt(fraction * (1 - fraction) / pixels) * sigma_dn /
         normal_density(normal_quantile(1 - fraction));
}

double clipped_variance_factor(double z) {
  return 1 - 2 * z * normal_density(z) / (2 * normal_cumulative(z) - 1);
}

}  // namespace evenfield
