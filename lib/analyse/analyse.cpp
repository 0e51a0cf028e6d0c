#include "analyse/analyse.h"

#include <algorithm>
#include <cmath>

#include "analyse/dark_current.h"
#include "analyse/data_sheet_findings.h"
#include "analyse/data_sheet_quantities.h"
#include "analyse/findings.h"
#include "analyse/gain.h"
#include "analyse/levels.h"
#include "analyse/nonuniformity.h"
#include "analyse/region_quantities.h"
#include "analyse/response.h"
#include "result/quantity_table.h"

namespace evenfield {
namespace {

SeriesResult series_result(const RegionLevels& levels, std::size_t series) {
  const SeriesInput& input = levels.input().series[series];
  const RegionSummary& summary = levels.summary(series);
  SeriesResult out;
  out.conditions = input.conditions;
  out.region = levels.input().regions[levels.region()].name;
  out.frames = summary.frames;
  out.pixels = static_cast<std::int64_t>(summary.pixels);
  out.mean_dn = summary.mean;
  out.mean_uncertainty_dn = levels.mean_uncertainty(series);
  out.variance_dn2 = summary.variance;
  if (summary.variance) out.variance_uncertainty_dn2 = *summary.variance * std::sqrt(2 / summary.dof);
  out.saturated_fraction = levels.saturated_share(summary);
  if (summary.scaled && summary.frame_mean_variance) {
    const auto level = std::find_if(levels.levels().begin(), levels.levels().end(),
                                    [&](const Level& l) { return l.series == series; });
    if (level != levels.levels().end())
      out.flicker_percent =
          100 *
          std::sqrt(std::max(0.0, *summary.frame_mean_variance - std::pow(levels.offset_jitter_dn(), 2))) /
          level->signal;
  }
  out.hits = summary.hits;
  out.files = input.files;
  return out;
}

RegionCurves region_curves(const RegionLevels& levels,
                           const GainAndNoise& gain,
                           const Response& response,
                           const DarkCurrent& dark,
                           const std::vector<int>& rows) {
  RegionCurves out;
  out.region = levels.input().regions[levels.region()].name;
  out.saturates = levels.top().saturates;
  if (!levels.levels().empty()) {
    out.range_top_dn = levels.top().signal_dn;
    out.gain_range_dn = kGainRange * levels.top().signal_dn;
  }
  const double reference = levels.dark_variance(gain.reference_dark);
  for (std::size_t i = 0; i < levels.levels().size(); ++i) {
    const Level& level = levels.levels()[i];
    const RegionSummary& flat = levels.summary(level.series);
    if (level.variance && level.dark_variance) {
      CurvePoint point;
      point.x = level.signal;
      point.y = *level.variance - *level.dark_variance;
      point.y_uncertainty = *level.variance * std::sqrt(2 / flat.dof);
      if (gain.line_gain)
        point.fitted = gain.line_gain->value * level.signal +
                       (gain.line_intercept_dn2 > 0 ? gain.line_intercept_dn2 - reference : 0.0);
      if (gain.curve) out.photon_transfer_curved.push_back(gain.curve->at(level.signal) - reference);
      point.used = std::find(gain.gain_levels.begin(), gain.gain_levels.end(), i) != gain.gain_levels.end();
      out.photon_transfer.push_back(point);
    }
    if (const auto axis = axis_of(levels, level)) {
      CurvePoint point;
      point.x = *axis;
      point.y = level.signal;
      point.y_uncertainty = levels.mean_uncertainty(level.series);
      if (response.line) point.fitted = response.line->at(*axis);
      point.used = std::find(response.levels.begin(), response.levels.end(), i) != response.levels.end();
      out.response.push_back(point);
    }
  }
  std::sort(out.response.begin(), out.response.end(),
            [](const CurvePoint& a, const CurvePoint& b) { return a.x < b.x; });
  for (std::size_t s = 0; s < levels.input().series.size(); ++s) {
    const RegionSummary& summary = levels.summary(s);
    const Conditions& conditions = levels.input().series[s].conditions;
    if (conditions.kind != SeriesKind::flat && conditions.exposure_s) {
      CurvePoint point;
      point.x = *conditions.exposure_s;
      point.y = summary.mean;
      point.y_uncertainty = levels.mean_uncertainty(s);
      point.used = std::find(dark.series.begin(), dark.series.end(), s) != dark.series.end();
      if (dark.dn_per_s) point.fitted = dark.offset_dn + dark.dn_per_s->value * point.x;
      out.dark_mean.push_back(point);
    }
    const double noise = std::sqrt(summary.variance.value_or(0.0) / summary.pixels);
    for (std::size_t f = 0; f < summary.frame_means.size(); ++f) {
      FrameMean mean;
      mean.series = rows[s];
      mean.kind = conditions.kind;
      mean.relative = summary.scales[f];
      mean.deviation_dn = summary.frame_means[f] - summary.mean;
      const bool relative = conditions.kind == SeriesKind::flat && summary.scaled;
      const auto level = std::find_if(levels.levels().begin(), levels.levels().end(),
                                      [&](const Level& l) { return l.series == s; });
      mean.deviation_uncertainty = relative && level != levels.levels().end() ? noise / level->signal : noise;
      out.frame_means.push_back(mean);
    }
  }
  std::sort(out.dark_mean.begin(), out.dark_mean.end(),
            [](const CurvePoint& a, const CurvePoint& b) { return a.x < b.x; });
  return out;
}

/// Measured signal-to-noise ratios, and what describes the ratio at any signal.
std::optional<SnrCurve> snr_curve(const RegionLevels& levels,
                                  const GainAndNoise& gain,
                                  const Nonuniformity& pattern,
                                  const Sensitivity& sensitivity) {
  if (!gain.gain || !sensitivity.dark_noise_e) return std::nullopt;
  SnrCurve out;
  const double k = gain.gain->value;
  for (const Level& level : levels.levels()) {
    if (!level.variance || !(*level.variance > 0) || !(level.signal > 0)) continue;
    const double ratio = level.signal / std::sqrt(*level.variance);
    out.points.push_back({level.signal / k, ratio, ratio / std::sqrt(2 * levels.summary(level.series).dof)});
  }
  if (out.points.empty()) return std::nullopt;
  out.dark_noise_e = sensitivity.dark_noise_e->value;
  if (pattern.dark && pattern.dark->square > 0) out.dsnu_e = std::sqrt(pattern.dark->square) / k;
  if (pattern.light && pattern.light->square > 0)
    out.prnu = std::sqrt(pattern.light->square) / pattern.light_signal_dn;
  if (levels.top().saturates && levels.top().unresolved.empty())
    out.saturation_e = levels.top().signal_dn / k;
  return out;
}

/// Region by region, in the order of the table of quantities, whoever made them.
void in_order_of_table(std::vector<Quantity>& quantities, std::size_t regions) {
  const std::span<const QuantityInfo> table = quantity_table();
  const auto place = [&](const Quantity& q) {
    return std::find_if(table.begin(), table.end(),
                        [&](const QuantityInfo& info) { return info.name == q.name; }) -
           table.begin();
  };
  const auto each = static_cast<std::ptrdiff_t>(quantities.size() / std::max<std::size_t>(regions, 1));
  for (auto first = quantities.begin(); first != quantities.end(); first += each)
    std::stable_sort(first, first + each,
                     [&](const Quantity& a, const Quantity& b) { return place(a) < place(b); });
}

void append(Correlations& all, const Correlations& one, const std::string& suffix) {
  const std::size_t before = all.names.size();
  for (const std::string& name : one.names) all.names.push_back(name + suffix);
  for (auto& row : all.matrix) row.resize(all.names.size(), 0.0);
  for (const auto& row : one.matrix) {
    std::vector<double> wide(before, 0.0);
    wide.insert(wide.end(), row.begin(), row.end());
    all.matrix.push_back(std::move(wide));
  }
}

}  // namespace

Characterization analyse(const AnalysisInput& input) {
  Characterization out;
  out.regions = input.regions;
  const std::size_t regions = input.regions.size();
  const Codes codes = find_codes(input);
  out.findings = session_findings(input, codes);
  std::vector<std::vector<SeriesResult>> table(regions);
  for (std::size_t r = 0; r < regions; ++r) {
    const RegionLevels levels(input, r, codes);
    const GainAndNoise gain = find_gain_and_noise(levels);
    const Response response = find_response(levels);
    const Nonuniformity pattern = find_nonuniformity(levels);
    const DarkCurrent dark = find_dark_current(levels);
    std::vector<int> rows;
    for (std::size_t s = 0; s < input.series.size(); ++s) {
      rows.push_back(static_cast<int>(s * regions + r));
      table[r].push_back(series_result(levels, s));
    }
    for (const std::size_t i : gain.gain_levels)
      table[r][levels.levels()[i].series].used_in.emplace_back("gain");
    for (const Level& level : levels.levels())
      if (axis_of(levels, level)) table[r][level.series].used_in.emplace_back("response");
    for (const std::size_t i : response.levels)
      table[r][levels.levels()[i].series].used_in.emplace_back("linearity");

    const DataSheet sheet{find_dark_noise_parts(levels),       pattern,
                          find_pattern_parts(levels, pattern), find_full_well(levels, response),
                          find_sensitivity(levels, gain),      find_shutter_offset(levels, response),
                          find_efficiency(levels, gain)};
    for (Quantity& q : region_quantities(levels, gain, response, pattern, dark))
      out.quantities.push_back(std::move(q));
    for (Quantity& q : data_sheet_quantities(levels, gain, dark, sheet))
      out.quantities.push_back(std::move(q));
    for (Finding& f : region_findings(levels, gain, response, rows)) out.findings.push_back(std::move(f));
    for (Finding& f : data_sheet_findings(levels, gain, dark, response, sheet, rows))
      out.findings.push_back(std::move(f));
    append(out.correlations, gain.correlations, regions > 1 ? "@" + input.regions[r].name : "");
    out.curves.push_back(region_curves(levels, gain, response, dark, rows));
    const auto picture_of = [&](const std::optional<SpatialEstimate>& of) -> std::optional<MeanFrame> {
      if (!of || of->series >= input.mean_frames.size() || input.mean_frames[of->series].empty())
        return std::nullopt;
      return input.mean_frames[of->series][r].pictures;
    };
    out.curves.back().dark_frame = picture_of(pattern.dark);
    out.curves.back().flat_frame = picture_of(pattern.light);
    out.curves.back().snr = snr_curve(levels, gain, pattern, sheet.sensitivity);
  }
  in_order_of_table(out.quantities, regions);
  for (std::size_t s = 0; s < input.series.size(); ++s)
    for (std::size_t r = 0; r < regions; ++r) out.series.push_back(std::move(table[r][s]));
  return out;
}

}  // namespace evenfield
