#include "model/stack_variance.h"

#include <string>

namespace evenfield {

Result<StackVariance> temporal_variance(std::span<const std::vector<double>> frames) {
  if (frames.size() < 2) {
    return Error{
        Errc::input,
        {},
        "temporal variance: found " + std::to_string(frames.size()) + " frames, expected at least 2"};
  }
  const std::size_t pixels = frames.front().size();
  for (std::size_t f = 0; f < frames.size(); ++f) {
    if (frames[f].size() != pixels || pixels < 2) {
      return Error{Errc::input,
                   {},
                   "temporal variance, frame " + std::to_string(f + 1) + ": found " +
                       std::to_string(frames[f].size()) + " pixels, expected " +
                       (pixels < 2 ? "at least 2" : std::to_string(pixels))};
    }
  }
  const auto n = static_cast<double>(pixels);
  const auto count = static_cast<double>(frames.size());
  std::vector<double> average(pixels, 0.0);
  std::vector<double> frame_means;
  double mean = 0;
  for (const std::vector<double>& frame : frames) {
    double sum = 0;
    for (std::size_t i = 0; i < pixels; ++i) {
      sum += frame[i];
      average[i] += frame[i] / count;
    }
    frame_means.push_back(sum / n);
    mean += sum / n / count;
  }
  StackVariance result;
  for (std::size_t f = 0; f < frames.size(); ++f) {
    for (std::size_t i = 0; i < pixels; ++i) {
      result.raw += (frames[f][i] - average[i]) * (frames[f][i] - average[i]) / (n * (count - 1));
    }
    result.drift += (frame_means[f] - mean) * (frame_means[f] - mean) / (count - 1);
  }
  for (const double pixel : average) {
    result.mean_image_variance += (pixel - mean) * (pixel - mean) / (n - 1);
  }
  result.corrected = result.raw - result.drift;
  result.unbiased = result.corrected * n / (n - 1);
  result.degrees_of_freedom = (n - 1) * (count - 1);
  return result;
}

double variance_of_variance(const PoissonCamera& camera, double pixels, double frames) {
  const double k = camera.gain_dn_per_e;
  const double variance = k * k * camera.signal_e + camera.dark_sigma_dn * camera.dark_sigma_dn;
  return (2 * variance * variance / (frames - 1) + k * k * k * k * camera.signal_e / frames) / pixels;
}

double variance_of_line_residual(const PoissonCamera& camera, double pixels, double frames) {
  const double k = camera.gain_dn_per_e;
  const double dark_variance = camera.dark_sigma_dn * camera.dark_sigma_dn;
  const double variance = k * k * camera.signal_e + dark_variance;
  return (2 * variance * variance / (frames - 1) + k * k * dark_variance / frames) / pixels;
}

}  // namespace evenfield
