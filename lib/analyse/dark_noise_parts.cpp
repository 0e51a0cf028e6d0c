#include "analyse/dark_noise_parts.h"

#include <cmath>

#include "analyse/dark_match.h"

namespace evenfield {

std::optional<std::size_t> noise_series(const RegionLevels& levels) {
  const AnalysisInput& input = levels.input();
  std::vector<std::size_t> darks;
  for (std::size_t s = 0; s < input.series.size(); ++s)
    if (input.series[s].conditions.kind != SeriesKind::flat && levels.summary(s).variance) darks.push_back(s);
  darks = shortest_exposure(input, darks);
  if (darks.empty()) return std::nullopt;
  std::size_t best = darks.front();
  for (const std::size_t s : darks)
    if (levels.summary(s).frames > levels.summary(best).frames) best = s;
  return best;
}

DarkNoiseParts find_dark_noise_parts(const RegionLevels& levels) {
  DarkNoiseParts out;
  const auto found = noise_series(levels);
  if (!found) {
    out.row_reason = out.frame_reason = "needs a dark or bias series of two frames or more";
    return out;
  }
  const std::size_t best = *found;
  const RegionSummary& dark = levels.summary(best);
  const double frames = dark.frames;
  if (dark.rows < 2 || dark.columns < 2 || !dark.row_pair_variance) {
    out.row_reason = "needs two rows and two columns or more";
  } else {
    // Half the variance of row means of a difference is row^2 + pixel^2 / N, the variance of a pixel row^2 +
    // pixel^2.
    const double n = dark.columns;
    SpatialEstimate row;
    row.square = (*dark.row_pair_variance - *dark.variance / n) / (1 - 1 / n);
    // Consecutive pairs share frames: the mean of F - 1 of them varies by (3 F - 4) / (F - 1)^2 V^2.
    const double share = (3 * frames - 4) / ((frames - 1) * (frames - 1) * (dark.rows - 1));
    row.square_uncertainty = *dark.row_pair_variance * std::sqrt(share) / (1 - 1 / n);
    row.series = best;
    out.row = row;
  }
  if (!dark.frame_mean_variance) {
    out.frame_reason = "needs two frames or more";
    return out;
  }
  // What frame means scatter by pixels and rows alone is part of what makes the difference uncertain.
  const double own =
      *dark.variance / dark.pixels + std::max(0.0, dark.row_noise_variance.value_or(0.0)) / dark.rows;
  out.frame =
      SpatialEstimate{*dark.frame_mean_variance,
                      (std::max(0.0, *dark.frame_mean_variance) + own) * std::sqrt(2 / (frames - 1)), best};
  return out;
}

}  // namespace evenfield
