#include "analyse/dark_current.h"

#include <algorithm>
#include <cmath>

#include "model/line_fit.h"

namespace evenfield {
namespace {

/// Slope of the darks' variances: shot noise of dark current grows with exposure, read noise does not.
void find_variance_slope(const RegionLevels& levels, DarkCurrent& out) {
  std::vector<LinePoint> points;
  std::vector<std::size_t> series;
  for (const std::size_t s : out.series) {
    const RegionSummary& dark = levels.summary(s);
    if (!dark.variance || !(*dark.variance > 0) || !(dark.dof > 0)) continue;
    // Noise that rows share makes pixels of a row count less (METHODS 1.2: nu / sum of squared correlations).
    const double share = std::max(0.0, dark.row_noise_variance.value_or(0.0)) / *dark.variance;
    const double dof = dark.dof / (1 + share * share * std::max(0, dark.columns - 1));
    points.push_back({*levels.input().series[s].conditions.exposure_s, *dark.variance,
                      dof / (2 * *dark.variance * *dark.variance)});
    series.push_back(s);
  }
  if (exposure_count(levels.input(), series) < 2) {
    out.variance_reason = "needs darks of two exposures or more, of two frames or more each";
    return;
  }
  const auto line = fit_line(points);
  if (!line) {
    out.variance_reason = "no line fits the dark variances: " + line.error().what;
    return;
  }
  const double spread =
      line->degrees_of_freedom > 0 ? std::max(1.0, line->chi2 / line->degrees_of_freedom) : 1.0;
  out.variance_dn2_per_s = Estimate{line->slope, std::sqrt(line->slope_variance * spread), 0.0,
                                    spread > 1 ? std::optional(line->degrees_of_freedom) : std::nullopt};
}

}  // namespace

DarkCurrent find_dark_current(const RegionLevels& levels) {
  DarkCurrent out;
  const AnalysisInput& input = levels.input();
  // The largest set of darks that were taken alike.
  for (std::size_t s = 0; s < input.series.size(); ++s) {
    if (input.series[s].conditions.kind == SeriesKind::flat || !input.series[s].conditions.exposure_s)
      continue;
    std::vector<std::size_t> alike = matching_darks(input, input.series[s].conditions);
    std::erase_if(alike, [&](std::size_t k) { return !input.series[k].conditions.exposure_s; });
    if (exposure_count(input, alike) > exposure_count(input, out.series)) out.series = alike;
  }
  if (exposure_count(input, out.series) < 2) {
    out.series.clear();
    out.reason = out.variance_reason = "needs darks of two exposures or more";
    return out;
  }
  std::vector<LinePoint> points;
  double dof = levels.offset_jitter_dof();
  for (const std::size_t s : out.series) {
    // All darks share the scatter between frames; what differs is how many frames average it.
    points.push_back({*input.series[s].conditions.exposure_s, levels.summary(s).mean,
                      static_cast<double>(levels.summary(s).frames)});
    if (input.series[s].conditions.temperature_c)
      out.temperature_c = input.series[s].conditions.temperature_c;
  }
  find_variance_slope(levels, out);
  const auto line = fit_line(points);
  if (!line) {
    out.series.clear();
    out.reason = "no line fits the dark means: " + line.error().what;
    return out;
  }
  out.offset_dn = line->intercept;
  // Slope = sum of c_k y_k with c_k = w_k (t_k - mean t) / S_tt.
  double sum = 0;
  double centre = 0;
  for (const LinePoint& p : points) {
    sum += p.weight;
    centre += p.weight * p.x;
  }
  centre /= sum;
  double moment = 0;
  for (const LinePoint& p : points) moment += p.weight * (p.x - centre) * (p.x - centre);
  double variance = 0;
  for (std::size_t i = 0; i < points.size(); ++i)
    variance += std::pow(
        points[i].weight * (points[i].x - centre) / moment * levels.mean_uncertainty(out.series[i]), 2);
  if (variance <= 0) {
    out.reason = "the darks show no noise, so nothing is known of the uncertainty";
    return out;
  }
  const bool scatter_matters = levels.offset_jitter_dn() > 0 && dof > 0;
  out.dn_per_s =
      Estimate{line->slope, std::sqrt(variance), 0.0, scatter_matters ? std::optional(dof) : std::nullopt};
  out.note = std::to_string(exposure_count(input, out.series)) + " exposures";
  if (line->slope < 0)
    out.note += "; negative: the camera may regulate its dark level, which hides dark current";
  return out;
}

}  // namespace evenfield
