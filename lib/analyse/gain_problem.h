#pragma once
/// The fits behind gain and read noise, computed from all resampling units or with one left out. Part of
/// gain.cpp.

#include <array>
#include <map>
#include <optional>
#include <vector>

#include "analyse/gain.h"
#include "analyse/resampling.h"
#include "model/variance_line.h"

namespace evenfield {

/// Light levels that a curved relation needs: one more than its parameters, the dark beside them.
inline constexpr int kCurveLevels = 4;
/// What is computed again with each unit left out, and then what follows from it.
enum Statistic {
  kLine,
  kOrigin,
  kCurved,
  kCurvature,
  kLagSummed,
  kNoiseDn,
  kComputed,
  kGain = kComputed,
  kInverse,
  kNoiseE,
  kStatistics
};
inline constexpr std::array<const char*, kStatistics> kNames{"conversion_gain_line_dn_per_e",
                                                             "conversion_gain_origin_line_dn_per_e",
                                                             "conversion_gain_curved_dn_per_e",
                                                             "variance_curvature_per_e",
                                                             "conversion_gain_lag_summed_dn_per_e",
                                                             "read_noise_dn",
                                                             "conversion_gain_dn_per_e",
                                                             "conversion_gain_e_per_dn",
                                                             "read_noise_e"};

using Statistics = std::array<std::optional<double>, kStatistics>;

/// Fits to all units, from which those with a unit left out differ little.
struct WholeFits {
  std::optional<VarianceLine> line;
  std::optional<VarianceCurve> curve, lag_curve;
};

/// The headline and what follows from it.
void follow(Statistics& s, bool curved);

/// Everything that the jackknife computes again for each unit it leaves out.
class GainProblem {
 public:
  GainProblem(const RegionLevels& levels,
              const GainAndNoise& plan,
              SeriesWeights noise_dark,
              ResamplingUnit unit)
      : levels_(levels), plan_(plan), noise_dark_(std::move(noise_dark)), unit_(unit) {}

  /// Of all units; `fits` keeps what was fitted.
  Statistics whole(WholeFits& fits) { return at(-1, fits); }
  Statistics without(int unit, const WholeFits& fits) {
    WholeFits known = fits;
    return at(unit, known);
  }

 private:
  const UnitSums& sums(std::size_t series) {
    return cache_.try_emplace(series, levels_.summary(series), unit_).first->second;
  }
  Statistics at(int left_out, WholeFits& fits);
  void fit_gains(int left_out, WholeFits& fits, Statistics& out);
  std::optional<double> lag_summed(const std::vector<VariancePoint>& points, int left_out, WholeFits& fits);
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

}  // namespace evenfield
