#pragma once
/// What the analysis is given: the conditions and summaries of every series, and what the session says of the
/// camera.

#include <optional>
#include <string>
#include <vector>

#include "analyse/mean_frame_statistics.h"
#include "analyse/series_summary.h"
#include "result/characterization.h"

namespace evenfield {

/// Which model the headline gain follows; automatic: the line, unless a curve is proved and accounted for.
enum class GainModel { automatic, line, curved };

/// What the second look at a series found in one region.
struct MeanFrameFacts {
  HighPassVariance high_pass;
  std::optional<MeanFrame> pictures;
  std::optional<double> median_noise_dn;  ///< median over pixels of the temporal standard deviation
  double noise_log_variance = 0;          ///< over pixels, of the logarithm of that
};

struct AnalysisInput {
  std::vector<SeriesInput> series;  ///< in the order of the session
  std::vector<std::vector<MeanFrameFacts>>
      mean_frames;  ///< [series][region]; empty where there was no second look
  std::vector<Region> regions;
  std::optional<int> bit_depth;  ///< of the converter
  bool floating = false;         ///< pixels are floating-point numbers
  /// Relative standard uncertainty (k = 1) of exposure x light from level to level: repeats in every session.
  double level_relative_uncertainty = 0;
  GainModel gain_model = GainModel::automatic;
  bool has_light = false;  ///< the session tells the photons of its flats (SeriesInput::photons)
  double irradiance_relative_uncertainty = 0;  ///< k = 1; repeats in every session
};

}  // namespace evenfield
