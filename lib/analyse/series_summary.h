#pragma once
/// One series in one region, reduced from sums to means and variances per block. Frame-to-frame changes are
/// taken out here: of flats a scale per frame, of darks an offset per frame.
///
/// Flats: frame f shows a_f x light, with a_f the ratio of the frame's signal to the mean one (mean of a_f is
/// 1). The variance of a pixel is then K a_f x + V_d, and the weighted residuals
///   R = sum_f (y_f - o)^2 / a_f - (sum_f (y_f - o))^2 / sum_f a_f          (o: dark level)
/// have the expectation (F - 1) K x + V_d (sum_f 1/a_f - 1) for every light level x of the pixel, so that
/// neither drift nor vignetting biases V = R / (F - 1) by more than the square of the drift times V_d.
/// Derivation in DEVELOPERS.md.

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "accumulate/series_statistics.h"
#include "base/conditions.h"

namespace evenfield {

struct RegionSummary {
  int frames = 0;
  double pixels = 0;
  int block_columns = 0;
  int block_rows = 0;
  // Per block: number of pixels, mean over frames [DN], temporal sum of squares [DN^2] with its degrees of
  // freedom.
  std::vector<double> block_pixels, block_mean, block_squares, block_dof;
  std::vector<double>
      block_spread;  ///< standard deviation of the block's mean frame [DN], what is left of noise included
  std::vector<Extreme> block_highest;
  double mean = 0;                 ///< DN, offset included
  std::optional<double> variance;  ///< temporal [DN^2], from 2 frames on
  double dof = 0;                  ///< of `variance`
  std::optional<double>
      spatial_variance;             ///< of the mean frame, temporal noise taken out [DN^2], from 2 frames on
  std::vector<double> frame_means;  ///< DN
  std::vector<double> scales;       ///< a_f; all 1 where offsets were taken out instead
  bool scaled = false;              ///< scales, not offsets, were taken out
  /// Sample variance of the frame means less what noise of pixels and rows makes of it [DN^2].
  std::optional<double> frame_mean_variance;
  std::optional<double>
      row_noise_variance;           ///< temporal variance that a row shares, pixels' own noise less [DN^2]
  double row_pattern_variance = 0;  ///< of the rows' means over all frames, noise included [DN^2]
  int rows = 0;
  int columns = 0;
  /// Population variances of the row means and of the column means of the mean frame, noise included [DN^2].
  double row_means_variance = 0, column_means_variance = 0;
  /// Half the variance of the rows' means of the difference of two consecutive frames, mean over such pairs
  /// [DN^2]; from 2 frames on. For noise of rows and pixels: row^2 + pixel^2 / columns.
  std::optional<double> row_pair_variance;
  /// Neighbours in the difference of the first two frames; [block], no pixels for a single frame.
  std::vector<NeighbourSums> block_neighbours;
  /// Relative change of the signal from the first frame to the second (flats that are scaled).
  double first_change = 0;
  Extreme lowest, highest;
  std::int64_t hits = 0;
};

/// `dark_level` is the mean of matching darks [DN], for flats only: absent, offsets are taken out instead of
/// scales, as they are where the signal is too weak to tell a scale.
RegionSummary summarize(const RegionStatistics& region, std::optional<double> dark_level);

/// One series as the analysis sees it: how it was taken, and its summary in each region.
struct SeriesInput {
  Conditions conditions;
  std::vector<std::string> files;  ///< as results show them
  std::vector<RegionSummary> regions;
  std::vector<std::string> fingerprints;
  std::vector<double> code_sample;  ///< ascending
  std::optional<double> photons;    ///< a pixel and frame, mean
  std::optional<double> wavelength_nm;
};

}  // namespace evenfield
