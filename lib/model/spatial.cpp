#include "model/spatial.h"

#include <algorithm>
#include <cmath>

namespace evenfield {
namespace {

constexpr double kOneSided95 = 1.6448536269514722;  // normal quantile of 0.95

/// What the error of the temporal variance adds: it is subtracted, divided by the frames.
double correction_variance(double temporal, StackSize size) {
  return 2 * temporal * temporal / (size.frames * size.frames * size.pixels * (size.frames - 1));
}

}  // namespace

double spatial_variance(double measured, double temporal, double frames) {
  return measured - temporal / frames;
}

double spatial_variance_variance(double spatial, double temporal, StackSize size) {
  const double left = temporal / size.frames;  // temporal variance that averaging left
  return (4 * std::max(spatial, 0.0) * left + 2 * left * left) / size.pixels +
         correction_variance(temporal, size);
}

double spatial_variance_variance_of_population(double spatial, double temporal, StackSize size) {
  const double total = std::max(spatial, 0.0) + temporal / size.frames;
  return 2 * total * total / (size.pixels - 1) + correction_variance(temporal, size);
}

double frame_pair_covariance_variance(double spatial, double temporal, double pixels) {
  const double total = spatial + temporal;
  return (total * total + spatial * spatial) / (pixels - 1);
}

SpatialResult spatial_deviation(double spatial, double variance_of_spatial, double divisor) {
  SpatialResult result;
  const double uncertainty = std::sqrt(std::max(variance_of_spatial, 0.0));
  result.high95 = std::sqrt(std::max(spatial + kOneSided95 * uncertainty, 0.0)) / divisor;
  if (spatial > 0) {
    result.value = std::sqrt(spatial) / divisor;
    result.standard_uncertainty = uncertainty / (2 * std::sqrt(spatial)) / divisor;
  }
  return result;
}

}  // namespace evenfield
