#include "analyse/gain.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <map>

#include "model/gum.h"
#include "model/jackknife.h"
#include "model/quantization.h"
#include "model/variance_line.h"

namespace evenfield {
namespace {

/// Dark current may make up this share of the dark variance before read noise is extrapolated to zero
/// exposure.
constexpr double kDarkCurrentShare = 0.05;

enum Statistic { kGain, kInverse, kOrigin, kNoiseDn, kNoiseE, kStatistics };
constexpr std::array<const char*, kStatistics> kNames{"conversion_gain_dn_per_e", "conversion_gain_e_per_dn",
                                                      "conversion_gain_origin_line_dn_per_e", "read_noise_dn",
                                                      "read_noise_e"};

using Statistics = std::array<std::optional<double>, kStatistics>;

/// Everything that the jackknife computes again for each unit it leaves out.
class GainProblem {
 public:
  GainProblem(const RegionLevels& levels,
              const GainAndNoise& plan,
              SeriesWeights noise_dark,
              ResamplingUnit unit)
      : levels_(levels), plan_(plan), noise_dark_(std::move(noise_dark)), unit_(unit) {}

  Statistics at(int left_out, VarianceLine* line = nullptr);

 private:
  const UnitSums& sums(std::size_t series) {
    return cache_.try_emplace(series, levels_.summary(series), unit_).first->second;
  }
  double variance(const SeriesWeights& weights, int left_out) {
    double sum = 0;
    for (const auto& [series, weight] : weights) sum += weight * sums(series).variance(left_out);
    return sum;
  }
  double mean(const SeriesWeights& weights, int left_out) {
    double sum = 0;
    for (const auto& [series, weight] : weights) sum += weight * sums(series).mean(left_out);
    return sum;
  }
  /// Degrees of freedom of a weighted sum of variances: 2 V^2 / Var(V).
  double dof(const SeriesWeights& weights, int left_out) {
    double spread = 0;
    for (const auto& [series, weight] : weights) {
      const double v = sums(series).variance(left_out);
      spread += weight * weight * 2 * v * v / sums(series).dof(left_out);
    }
    const double v = variance(weights, left_out);
    return spread > 0 ? 2 * v * v / spread : 0;
  }

  const RegionLevels& levels_;
  const GainAndNoise& plan_;
  SeriesWeights noise_dark_;
  ResamplingUnit unit_;
  std::map<std::size_t, UnitSums> cache_;
};

Statistics GainProblem::at(int left_out, VarianceLine* line) {
  Statistics out;
  if (!plan_.gain_levels.empty()) {
    const double reference = variance(plan_.reference_dark, left_out);
    std::vector<VariancePoint> points{{0.0, reference, dof(plan_.reference_dark, left_out)}};
    double cross = 0;
    double square = 0;
    for (const std::size_t index : plan_.gain_levels) {
      const Level& level = levels_.levels()[index];
      const double x = sums(level.series).mean(left_out) - mean(level.dark.mean, left_out);
      const double v = sums(level.series).variance(left_out);
      const double dark = variance(level.dark.variance, left_out);
      points.push_back({x, v - (dark - reference), sums(level.series).dof(left_out)});
      cross += x * (v - dark);
      square += x * x;
    }
    // A camera whose darks show no noise at all still has a line; it then begins with the lowest light.
    if (points.front().variance <= 0) points.erase(points.begin());
    if (points.size() == 1) {
      if (points.front().x > 0) out[kGain] = points.front().variance / points.front().x;
    } else if (auto fit = fit_variance_line(points); fit && fit->slope > 0) {
      out[kGain] = fit->slope;
      if (line != nullptr) *line = *fit;
    }
    if (out[kGain]) out[kInverse] = 1 / *out[kGain];
    if (square > 0 && cross > 0) out[kOrigin] = cross / square;
  }
  const double excess = variance(noise_dark_, left_out) - quantization_variance(levels_.codes().step_dn);
  if (!noise_dark_.empty() && excess > 0) {
    out[kNoiseDn] = std::sqrt(excess);
    if (out[kGain]) out[kNoiseE] = *out[kNoiseDn] / *out[kGain];
  }
  return out;
}

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

/// Picks the levels of the fit, or says why there are none.
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

/// Which darks give the read noise.
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

}  // namespace

GainAndNoise find_gain_and_noise(const RegionLevels& levels) {
  GainAndNoise out;
  plan_gain(levels, out);
  VarianceLine line;
  Statistics whole = GainProblem(levels, out, {}, ResamplingUnit::blocks).at(-1, &line);
  const SeriesWeights noise_dark = plan_noise(levels, whole[kGain].value_or(0.0), out);

  std::vector<std::size_t> used;
  for (const std::size_t index : out.gain_levels) used.push_back(levels.levels()[index].series);
  for (const auto& [series, weight] : noise_dark) used.push_back(series);
  const ResamplingUnit unit =
      rows_are_correlated(levels, used) ? ResamplingUnit::bands : ResamplingUnit::blocks;

  GainProblem problem(levels, out, noise_dark, unit);
  whole = problem.at(-1, &line);
  out.line_intercept_dn2 = line.intercept;
  if (!whole[kGain] && out.gain_reason.empty())
    out.gain_reason = "the temporal variance does not rise with the signal";

  std::vector<int> present;
  for (int k = 0; k < kStatistics; ++k)
    if (whole[static_cast<std::size_t>(k)]) present.push_back(k);
  const double step = levels.codes().step_dn;
  if (!noise_dark.empty()) {
    const double variance = levels.dark_variance(noise_dark);
    if (variance <= kUnresolvedVariance * step * step || !whole[kNoiseDn]) {
      out.read_noise_reason =
          variance <= 0
              ? "the darks show no noise at all; frames that were never read out look like this"
              : "the step of the codes hides the noise; the upper limit is that of EMVA 1288 (from memory)";
      if (variance > 0) out.read_noise_high95_dn = unresolved_noise_limit(step);
      std::erase(present, kNoiseDn);
      std::erase(present, kNoiseE);
    }
  }
  if (used.empty() || present.empty()) return out;

  const int units = unit_count(levels.summary(used.front()), unit);
  if (units < 2) {
    const std::string reason = "the region is too small for an uncertainty: it has one block";
    if (whole[kGain]) out.gain_reason = reason;
    if (whole[kNoiseDn]) out.read_noise_reason = reason;
    return out;
  }
  Matrix left_out(units, static_cast<int>(present.size()));
  for (int u = 0; u < units; ++u) {
    const Statistics values = problem.at(u);
    for (std::size_t k = 0; k < present.size(); ++k)
      left_out(u, static_cast<int>(k)) =
          values[static_cast<std::size_t>(present[k])].value_or(*whole[static_cast<std::size_t>(present[k])]);
  }
  const auto resampled = jackknife(left_out);
  if (!resampled) {
    if (whole[kGain]) out.gain_reason = "no uncertainty could be had: " + resampled.error().what;
    if (whole[kNoiseDn]) out.read_noise_reason = "no uncertainty could be had: " + resampled.error().what;
    return out;
  }
  const std::array<std::optional<Estimate>*, kStatistics> targets{&out.gain, nullptr, &out.origin_gain,
                                                                  &out.read_noise_dn, &out.read_noise_e};
  for (std::size_t k = 0; k < present.size(); ++k) {
    const int column = static_cast<int>(k);
    const auto statistic = static_cast<std::size_t>(present[k]);
    out.correlations.names.emplace_back(kNames[statistic]);
    if (targets[statistic] != nullptr)
      *targets[statistic] = Estimate{*whole[statistic], std::sqrt(resampled->covariance(column, column)), 0.0,
                                     resampled->degrees_of_freedom};
  }
  const Matrix correlation = correlation_of(resampled->covariance);
  for (int i = 0; i < correlation.rows; ++i) {
    std::vector<double> row;
    for (int j = 0; j < correlation.columns; ++j) row.push_back(correlation(i, j));
    out.correlations.matrix.push_back(std::move(row));
  }
  if (out.gain && out.gain->statistical_uncertainty <= 0) {
    out.gain.reset();
    out.origin_gain.reset();
    out.read_noise_e.reset();
    out.gain_reason = "the frames show no noise of their own, so nothing is known of the uncertainty";
  }
  if (out.gain && out.origin_gain) {
    const Matrix& c = resampled->covariance;
    const auto column = [&](int statistic) {
      return static_cast<int>(std::find(present.begin(), present.end(), statistic) - present.begin());
    };
    const int line_column = column(kGain);
    const int origin_column = column(kOrigin);
    const double variance =
        c(line_column, line_column) + c(origin_column, origin_column) - 2 * c(line_column, origin_column);
    if (variance > 0)
      out.origin_disagreement = (out.origin_gain->value - out.gain->value) / std::sqrt(variance);
  }
  out.gain_note = unit == ResamplingUnit::bands ? "rows share noise, so bands of rows were resampled" : "";
  return out;
}

}  // namespace evenfield
