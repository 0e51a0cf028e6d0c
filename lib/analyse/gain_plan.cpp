#include "analyse/gain_plan.h"

#include <algorithm>
#include <cmath>

#include "base/text.h"

namespace evenfield {
namespace {

/// Dark current may make up this share of the dark variance before read noise is extrapolated to zero
/// exposure.
constexpr double kDarkCurrentShare = 0.05;

/// A drift between the first two frames that adds more than this share to the variance through uneven light
/// spoils the sum of neighbours.
constexpr double kDriftShare = 1e-3;

/// Levels whose first two frames differ by noise alone, so that the sum of neighbours is that of noise.
void plan_lags(const RegionLevels& levels, GainAndNoise& out) {
  double largest = 0;
  for (const std::size_t i : out.gain_levels) {
    const Level& level = levels.levels()[i];
    const RegionSummary& flat = levels.summary(level.series);
    double uneven = 0;
    for (std::size_t b = 0; b < flat.block_spread.size(); ++b)
      uneven += flat.block_pixels[b] / flat.pixels * flat.block_spread[b] * flat.block_spread[b];
    largest = std::max(largest, std::abs(flat.first_change));
    // Nine of them: the pixel itself and its neighbours, as alike as uneven light makes them at worst.
    if (9 * flat.first_change * flat.first_change * uneven < kDriftShare * *level.variance)
      out.lag_levels.push_back(i);
  }
  if (out.lag_levels.empty())
    out.lag_reason =
        "the light changed by up to " + to_text(100 * largest, 2) +
        " % between the first two frames of a level, which in uneven light hides what neighbours "
        "share";
}

}  // namespace

/// Pixels of a row that share noise make blocks side by side move together; bands of rows then are what is
/// independent. Row noise matters where it makes up a tenth of the variance of V: (share of row noise)^2 x
/// pixels of a row.
bool rows_are_correlated(const RegionLevels& levels, const std::vector<std::size_t>& series) {
  for (const std::size_t s : series) {
    const RegionSummary& summary = levels.summary(s);
    if (!summary.row_noise_variance || !summary.variance || *summary.variance <= 0) continue;
    const double width = levels.input().regions[levels.region()].rect.width;
    const double height = levels.input().regions[levels.region()].rect.height;
    const double expected = *summary.variance / width;
    const double significance = 5.0 * expected * std::sqrt(2.0 / ((height - 1) * (summary.frames - 1)));
    const double share = *summary.row_noise_variance / *summary.variance;
    if (*summary.row_noise_variance > significance && share * share * width > 0.1) return true;
  }
  return false;
}

void plan_gain(const RegionLevels& levels, GainAndNoise& out) {
  if (levels.levels().empty()) {
    out.gain_reason = "needs flats and matching darks";
    return;
  }
  bool one_frame = false;
  bool no_dark_variance = false;
  for (std::size_t i = 0; i < levels.levels().size(); ++i) {
    const Level& level = levels.levels()[i];
    if (levels.saturated(level) || level.signal <= 0 || level.signal > kGainRange * levels.top().signal_dn)
      continue;
    if (!level.variance) {
      one_frame = true;
    } else if (!level.dark_variance) {
      no_dark_variance = true;
    } else {
      out.gain_levels.push_back(i);
    }
  }
  // One light level far from saturation is used wherever it lies: 70 % of itself would be nothing.
  if (out.gain_levels.empty() && !one_frame && !no_dark_variance && !levels.top().saturates)
    for (std::size_t i = 0; i < levels.levels().size(); ++i)
      if (levels.levels()[i].variance && levels.levels()[i].signal > 0) out.gain_levels.push_back(i);
  if (!out.gain_levels.empty()) {
    // The reference is the shortest dark that matches the levels.
    std::vector<std::size_t> darks = matching_darks(
        levels.input(), levels.input().series[levels.levels()[out.gain_levels.front()].series].conditions);
    std::erase_if(darks, [&](std::size_t s) { return !levels.summary(s).variance; });
    darks = shortest_exposure(levels.input(), darks);
    double dof = 0;
    for (const std::size_t s : darks) dof += levels.summary(s).dof;
    for (const std::size_t s : darks) out.reference_dark.emplace_back(s, levels.summary(s).dof / dof);
    plan_lags(levels, out);
  } else if (one_frame) {
    out.gain_reason =
        "needs two frames or more of the same light level: one frame does not tell noise from pattern";
  } else if (no_dark_variance) {
    out.gain_reason = "needs a matching dark series of two frames or more";
  } else {
    out.gain_reason = "no level with light lies below " + std::to_string(static_cast<int>(100 * kGainRange)) +
                      " % of the range top";
  }
}

SeriesWeights plan_noise(const RegionLevels& levels, double gain, GainAndNoise& out) {
  const AnalysisInput& input = levels.input();
  std::vector<std::size_t> darks;
  for (std::size_t s = 0; s < input.series.size(); ++s)
    if (input.series[s].conditions.kind != SeriesKind::flat && levels.summary(s).variance) darks.push_back(s);
  if (darks.empty()) {
    out.read_noise_reason = "needs a dark or bias series of two frames or more";
    return {};
  }
  const std::vector<std::size_t> shortest = shortest_exposure(input, darks);
  // Other darks serve only if they were taken like the shortest.
  std::vector<std::size_t> alike = matching_darks(input, input.series[shortest.front()].conditions);
  std::erase_if(alike, [&](std::size_t s) {
    return !levels.summary(s).variance || !input.series[s].conditions.exposure_s;
  });
  double dof = 0;
  for (const std::size_t s : shortest) dof += levels.summary(s).dof;
  SeriesWeights weights;
  for (const std::size_t s : shortest) weights.emplace_back(s, levels.summary(s).dof / dof);
  out.read_exposure_s = input.series[shortest.front()].conditions.exposure_s;
  const std::string frames = std::to_string(levels.summary(shortest.front()).frames);
  out.read_noise_method =
      "temporal variance of the darks of the shortest exposure, pixels pooled, quantization taken out";
  if (!out.read_exposure_s) {
    out.read_noise_note = "the exposure of the darks is not stated; their dark current is part of the noise";
    return weights;
  }
  if (*out.read_exposure_s == 0) return weights;
  if (exposure_count(input, alike) < 2) {
    out.read_noise_note = "darks of one exposure only: what dark current adds is part of the noise";
    return weights;
  }
  std::vector<double> frame_counts;
  std::vector<double> precision;
  for (const std::size_t s : alike) {
    const RegionSummary& summary = levels.summary(s);
    frame_counts.push_back(summary.frames);
    precision.push_back(*summary.variance > 0 ? summary.dof / (2 * *summary.variance * *summary.variance)
                                              : summary.dof);
  }
  const double at_zero = levels.dark_mean(line_weights(input, alike, frame_counts, 0.0));
  const double at_read = levels.dark_mean(line_weights(input, alike, frame_counts, *out.read_exposure_s));
  const double dark_current_dn2 = gain * (at_read - at_zero);
  if (dark_current_dn2 < kDarkCurrentShare * levels.dark_variance(weights)) return weights;
  out.read_noise_method =
      "temporal variance of the darks extrapolated to zero exposure, pixels pooled, quantization taken out";
  out.read_exposure_s = 0.0;
  return line_weights(input, alike, precision, 0.0);
}

}  // namespace evenfield
