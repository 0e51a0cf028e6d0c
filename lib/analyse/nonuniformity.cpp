#include "analyse/nonuniformity.h"

#include <cmath>

#include "model/quantization.h"
#include "model/spatial.h"

namespace evenfield {
namespace {

SpatialEstimate spatial_estimate(const RegionLevels& levels, std::size_t series) {
  const RegionSummary& s = levels.summary(series);
  const double frames = s.frames;
  double variance = spatial_variance_variance(*s.spatial_variance, *s.variance, {s.pixels, frames});
  // Noise that rows share is averaged over frames but not over the pixels of a row: the same closed form once
  // more, for the rows' means.
  if (s.row_noise_variance && *s.row_noise_variance > 0 && s.rows > 1) {
    const double pattern = s.row_pattern_variance - *s.row_noise_variance / frames;
    variance +=
        spatial_variance_variance(pattern, *s.row_noise_variance, {static_cast<double>(s.rows), frames});
  }
  return {*s.spatial_variance, std::sqrt(variance), series};
}

/// Of these darks the one of most frames; of equals the shortest exposure.
std::optional<std::size_t> best_dark(const RegionLevels& levels, const std::vector<std::size_t>& darks) {
  std::optional<std::size_t> best;
  const auto exposure = [&](std::size_t s) {
    return levels.input().series[s].conditions.exposure_s.value_or(1e300);
  };
  for (const std::size_t s : darks) {
    const RegionSummary& summary = levels.summary(s);
    if (!summary.spatial_variance) continue;
    if (!best || summary.frames > levels.summary(*best).frames ||
        (summary.frames == levels.summary(*best).frames && exposure(s) < exposure(*best)))
      best = s;
  }
  return best;
}

/// Of the darks that match a flat the one of the nearest exposure, whose pattern lies under the flat's; of
/// equals the one of most frames.
std::optional<std::size_t> nearest_dark(const RegionLevels& levels, std::size_t flat) {
  const Conditions& conditions = levels.input().series[flat].conditions;
  const auto distance = [&](std::size_t s) {
    const auto& exposure = levels.input().series[s].conditions.exposure_s;
    return exposure && conditions.exposure_s ? std::abs(*exposure - *conditions.exposure_s) : 0.0;
  };
  std::optional<std::size_t> nearest;
  for (const std::size_t s : matching_darks(levels.input(), conditions)) {
    if (!levels.summary(s).spatial_variance) continue;
    if (!nearest || distance(s) < distance(*nearest) ||
        (distance(s) == distance(*nearest) && levels.summary(s).frames > levels.summary(*nearest).frames))
      nearest = s;
  }
  return nearest;
}

}  // namespace

Nonuniformity find_nonuniformity(const RegionLevels& levels) {
  Nonuniformity out;
  std::vector<std::size_t> darks;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s)
    if (levels.input().series[s].conditions.kind != SeriesKind::flat) darks.push_back(s);
  const double step = levels.codes().step_dn;
  if (const auto best = best_dark(levels, darks)) {
    if (*levels.summary(*best).variance <= kUnresolvedVariance * step * step)
      out.dark_reason =
          "the step of the codes hides the noise, and with it the pattern of pixels below a step";
    else
      out.dark = spatial_estimate(levels, *best);
  } else
    out.dark_reason = "needs a dark or bias series of two frames or more";

  const Level* nearest = nullptr;
  const double half = 0.5 * levels.top().signal_dn;
  for (const Level& level : levels.levels()) {
    if (levels.saturated(level) || level.signal <= 0 || !levels.summary(level.series).spatial_variance)
      continue;
    if (nearest == nullptr || std::abs(level.signal - half) < std::abs(nearest->signal - half))
      nearest = &level;
  }
  if (nearest == nullptr) {
    out.light_reason = "needs an unsaturated flat series of two frames or more, and matching darks";
    return out;
  }
  const auto dark = nearest_dark(levels, nearest->series);
  if (!dark) {
    out.light_reason = "needs a matching dark series of two frames or more";
    return out;
  }
  const SpatialEstimate flat = spatial_estimate(levels, nearest->series);
  const SpatialEstimate off = spatial_estimate(levels, *dark);
  out.light = {flat.square - off.square, std::hypot(flat.square_uncertainty, off.square_uncertainty),
               nearest->series};
  out.light_dark_series = out.light_high_pass_dark_series = *dark;
  // A difference of darks of a ten-thousandth of the flat's pattern moves its root by 5e-5.
  constexpr double kAlike = 1e-4;
  if (out.dark && std::abs(out.dark->square - off.square) < kAlike * flat.square)
    out.light_high_pass_dark_series = out.dark->series;
  out.light_signal_dn = nearest->signal;
  double variance = std::pow(levels.mean_uncertainty(nearest->series), 2);
  for (const auto& [series, weight] : nearest->dark.mean)
    variance += std::pow(weight * levels.mean_uncertainty(series), 2);
  out.light_signal_uncertainty_dn = std::sqrt(variance);
  return out;
}

}  // namespace evenfield
