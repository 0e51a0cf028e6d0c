#include "model/read_noise.h"

#include <algorithm>
#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/math/special_functions/trigamma.hpp>
#include <cmath>
#include <limits>

#include "model/student.h"

namespace evenfield {

std::optional<ReadNoise> read_noise_from_dark(double dark_variance,
                                              double degrees_of_freedom,
                                              double quantization,
                                              double gain,
                                              double gain_relative_uncertainty) {
  const double noise = dark_variance - quantization;
  if (!(noise > 0) || !(gain > 0) || !(degrees_of_freedom > 0)) return std::nullopt;
  const double value = std::sqrt(noise) / gain;
  const double relative = dark_variance / noise / std::sqrt(2 * degrees_of_freedom);
  return ReadNoise{value, value * std::hypot(relative, gain_relative_uncertainty)};
}

std::optional<ReadNoise> read_noise_from_line(const VarianceLine& line, double quantization) {
  const double noise = line.intercept - quantization;
  if (!(noise > 0) || !(line.slope > 0)) return std::nullopt;
  const double value = std::sqrt(noise) / line.slope;
  // Sensitivities of r = sqrt(b - q) / K.
  const double to_intercept = value / (2 * noise);
  const double to_slope = -value / line.slope;
  const double variance = to_intercept * to_intercept * line.intercept_variance +
                          to_slope * to_slope * line.slope_variance +
                          2 * to_intercept * to_slope * line.covariance;
  return ReadNoise{value, std::sqrt(variance)};
}

double deviation_bias(int frames) {
  if (frames < 2) return std::numeric_limits<double>::quiet_NaN();
  const double half = (frames - 1) / 2.0;
  return 1 / (boost::math::tgamma_delta_ratio(half, 0.5) * std::sqrt(half));
}

double deviation_log_variance(int frames) { return boost::math::trigamma((frames - 1) / 2.0) / 4; }

double deviation_median(int frames, double log_variance) {
  const double half = (frames - 1) / 2.0;
  const double mean = (boost::math::digamma(half) - std::log(half)) / 2;
  const double own = deviation_log_variance(frames);
  const double share = own / std::max(own, log_variance);
  return std::exp(mean + (std::log(deviation_median(frames)) - mean) * share);
}

double deviation_median(int frames) { return std::sqrt(chi_square_quantile(0.5, frames - 1) / (frames - 1)); }

}  // namespace evenfield
