#include "analyse/dark_match.h"

#include <algorithm>
#include <cmath>
#include <set>

namespace evenfield {
namespace {

constexpr double kTemperatureTolerance_k = 1.0;

bool alike(const std::optional<double>& a, const std::optional<double>& b, double tolerance) {
  return !a || !b || std::abs(*a - *b) <= tolerance;
}

/// Weights in proportion to `precision`.
SeriesWeights mean_weights(const std::vector<std::size_t>& series, const std::vector<double>& precision) {
  double sum = 0;
  for (const double p : precision) sum += p;
  SeriesWeights out;
  for (std::size_t i = 0; i < series.size(); ++i) out.emplace_back(series[i], precision[i] / sum);
  return out;
}

std::vector<double> frames_of(const AnalysisInput& input,
                              std::size_t region,
                              const std::vector<std::size_t>& series) {
  std::vector<double> out;
  for (const std::size_t s : series) out.push_back(input.series[s].regions[region].frames);
  return out;
}

/// 1 / Var(V), from the degrees of freedom.
std::vector<double> variance_precision(const AnalysisInput& input,
                                       std::size_t region,
                                       const std::vector<std::size_t>& series) {
  std::vector<double> out;
  for (const std::size_t s : series) {
    const RegionSummary& summary = input.series[s].regions[region];
    const double variance = summary.variance.value_or(0.0);
    out.push_back(variance > 0 ? summary.dof / (2 * variance * variance) : summary.dof);
  }
  return out;
}

}  // namespace

std::vector<std::size_t> matching_darks(const AnalysisInput& input, const Conditions& conditions) {
  std::vector<std::size_t> out;
  for (std::size_t i = 0; i < input.series.size(); ++i) {
    const Conditions& dark = input.series[i].conditions;
    if (dark.kind != SeriesKind::flat && alike(dark.em_gain, conditions.em_gain, 0) &&
        alike(dark.control_v, conditions.control_v, 0) &&
        alike(dark.temperature_c, conditions.temperature_c, kTemperatureTolerance_k))
      out.push_back(i);
  }
  return out;
}

int exposure_count(const AnalysisInput& input, const std::vector<std::size_t>& series) {
  std::set<double> exposures;
  for (const std::size_t s : series)
    if (input.series[s].conditions.exposure_s) exposures.insert(*input.series[s].conditions.exposure_s);
  return static_cast<int>(exposures.size());
}

std::vector<std::size_t> shortest_exposure(const AnalysisInput& input,
                                           const std::vector<std::size_t>& darks) {
  std::optional<double> shortest;
  for (const std::size_t s : darks) {
    const auto& exposure = input.series[s].conditions.exposure_s;
    if (exposure && (!shortest || *exposure < *shortest)) shortest = exposure;
  }
  std::vector<std::size_t> out;
  for (const std::size_t s : darks)
    if (!shortest || input.series[s].conditions.exposure_s == shortest) out.push_back(s);
  return out;
}

SeriesWeights line_weights(const AnalysisInput& input,
                           const std::vector<std::size_t>& series,
                           const std::vector<double>& precision,
                           double exposure_s) {
  double sum = 0;
  double centre = 0;
  const auto exposure = [&](std::size_t i) { return *input.series[series[i]].conditions.exposure_s; };
  for (std::size_t i = 0; i < series.size(); ++i) {
    sum += precision[i];
    centre += precision[i] * exposure(i);
  }
  centre /= sum;
  double moment = 0;
  for (std::size_t i = 0; i < series.size(); ++i)
    moment += precision[i] * (exposure(i) - centre) * (exposure(i) - centre);
  SeriesWeights out;
  for (std::size_t i = 0; i < series.size(); ++i)
    out.emplace_back(series[i],
                     precision[i] * (1 / sum + (exposure_s - centre) * (exposure(i) - centre) / moment));
  return out;
}

MatchedDark match_dark(const AnalysisInput& input, std::size_t region, const Conditions& flat) {
  MatchedDark out;
  std::vector<std::size_t> darks = matching_darks(input, flat);
  if (darks.empty()) return out;
  const auto with_frames = [&](std::vector<std::size_t> series) {
    std::erase_if(series, [&](std::size_t s) { return !input.series[s].regions[region].variance; });
    return series;
  };
  // Where the flat's exposure is known, darks without one say nothing about it, unless there are no others.
  std::vector<std::size_t> known;
  for (const std::size_t s : darks)
    if (input.series[s].conditions.exposure_s) known.push_back(s);
  if (!known.empty()) darks = known;
  out.exposure_unknown = !flat.exposure_s || known.empty();
  out.line = flat.exposure_s && exposure_count(input, darks) > 1;
  if (!out.line) {
    darks = shortest_exposure(input, darks);
    out.mean = mean_weights(darks, frames_of(input, region, darks));
    const auto repeated = with_frames(darks);
    if (!repeated.empty()) out.variance = mean_weights(repeated, variance_precision(input, region, repeated));
    if (!out.exposure_unknown)
      out.exposure_difference_s = *flat.exposure_s - *input.series[darks.front()].conditions.exposure_s;
    return out;
  }
  out.mean = line_weights(input, darks, frames_of(input, region, darks), *flat.exposure_s);
  bool above = false;
  bool below = false;
  for (const std::size_t s : darks) {
    above = above || *input.series[s].conditions.exposure_s >= *flat.exposure_s;
    below = below || *input.series[s].conditions.exposure_s <= *flat.exposure_s;
  }
  out.extrapolated = !above || !below;
  const auto repeated = with_frames(darks);
  if (exposure_count(input, repeated) > 1)
    out.variance =
        line_weights(input, repeated, variance_precision(input, region, repeated), *flat.exposure_s);
  else if (!repeated.empty())
    out.variance = mean_weights(repeated, variance_precision(input, region, repeated));
  return out;
}

}  // namespace evenfield
