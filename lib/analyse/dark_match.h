#pragma once
/// Which darks belong to a flat, and what they say at its exposure: mean and variance as weighted sums over
/// dark series.
///
/// A matching dark has the flat's em_gain, control_v and temperature within 1 K, as far as both are known. Of
/// several exposures a straight line gives mean and variance; of one, that one is used as it is.

#include <utility>
#include <vector>

#include "analyse/analysis_input.h"

namespace evenfield {

using SeriesWeights = std::vector<std::pair<std::size_t, double>>;  ///< series, weight; weights add up to 1

struct MatchedDark {
  SeriesWeights mean;                ///< empty: no dark matches
  SeriesWeights variance;            ///< empty: no matching dark has two frames
  bool line = false;                 ///< several exposures, so that the flat's own could be computed
  bool extrapolated = false;         ///< the flat's exposure lies outside the darks'
  bool exposure_unknown = false;     ///< of the flat, or of the only dark
  double exposure_difference_s = 0;  ///< flat less dark, where one dark exposure is used as it is
};

/// Series are dark or bias, with conditions like `conditions`.
std::vector<std::size_t> matching_darks(const AnalysisInput& input, const Conditions& conditions);

MatchedDark match_dark(const AnalysisInput& input, std::size_t region, const Conditions& flat);

/// Weights that evaluate, at `exposure_s`, the straight line through these series' values (weights
/// `precision`).
SeriesWeights line_weights(const AnalysisInput& input,
                           const std::vector<std::size_t>& series,
                           const std::vector<double>& precision,
                           double exposure_s);

/// Of these darks, those of the shortest known exposure (all, if none is known).
std::vector<std::size_t> shortest_exposure(const AnalysisInput& input, const std::vector<std::size_t>& darks);

/// Number of different known exposures.
int exposure_count(const AnalysisInput& input, const std::vector<std::size_t>& series);

}  // namespace evenfield
