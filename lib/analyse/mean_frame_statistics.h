#pragma once
/// What the mean frame of a series in one region says: its spatial variance without slow changes across the
/// frame (METHODS 5.3) and, for pictures, its lines, spectra and histograms (METHODS 5.4, 5.5).

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "result/characterization.h"

namespace evenfield {

struct MeanFrameInput {
  std::span<const float> pixels;  ///< mean over the frames less level_dn [DN], row by row, all finite
  int width = 0;
  int height = 0;
  double level_dn = 0;
  int frames = 0;
  /// Variance that temporal noise leaves in each pixel: that of one frame over the number of frames [DN^2].
  double noise_left_dn2 = 0;
  double row_noise_left_dn2 = 0;  ///< the part of it that the pixels of a row share: lines to the filter
  /// Pixels are no whole numbers, so that means are no multiples of 1 / frames: bins of histograms then only
  /// follow the range of values.
  bool continuous = false;
};

struct MeanFrameStatisticsOptions {
  /// False: only the high-pass variance is computed, at the cost of running sums over the image. True:
  /// profiles, spectrograms and histograms too, several times that.
  bool pictures = false;
  int threads = 1;
  /// Profiles and spectra of more values are shortened: k neighbours, as few as will do, become one.
  int most_values = 4096;
};

/// Spatial variance of the mean frame less its low-pass, over the interior that the filter reaches in full.
struct HighPassVariance {
  /// Temporal noise taken out and divided by the filter's gain for white noise [DN^2]: without bias for a
  /// pattern that is white. May be negative. Absent for regions that the filter does not fit into.
  std::optional<double> variance_dn2;
  std::optional<double> filtered_dn2;  ///< the same as the filter leaves it, not divided
  double noise_gain = 0;               ///< of the filter
  /// Of the interior. Pixels of a filtered image are nearly independent: spatial_variance_variance() with
  /// this number and the temporal variance of one frame is the variance of variance_dn2.
  std::int64_t pixels = 0;
  std::string note;  ///< why there is no value
};

struct MeanFrameStatistics {
  HighPassVariance high_pass;
  /// Only with `pictures`; MeanFrame::series is left to the caller. normal_dn holds the noise that averaging
  /// left, as the histogram of the values does; of the white parts of rows and columns it is made of the
  /// lesser, because a pattern of columns looks white along rows.
  std::optional<MeanFrame> pictures;
};

/// The same bits for any number of threads. Spectrograms whose white part is not above the temporal noise
/// have non_whiteness 0. An interrupt leaves values out: look at interrupt_requested() before using them.
MeanFrameStatistics mean_frame_statistics(const MeanFrameInput& input,
                                          const MeanFrameStatisticsOptions& options);

}  // namespace evenfield
