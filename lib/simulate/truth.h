#pragma once
/// What a realized sensor really is: the numbers that a measurement of its frames should find.
///
/// DN here are those of the file: codes after left_shift, so gains and offsets are 2^left_shift times the
/// scene's. Spreads over pixels divide by their number: all pixels are known. Quantization and clipping at 0
/// are in none of them.

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "base/image.h"
#include "simulate/sensor.h"

namespace evenfield {

enum class SaturationLimit { converter, well };

/// Of the columns of one amplifier.
struct RegionTruth {
  std::string name;
  Rect rect;
  double conversion_gain_dn_per_e = 0.0;  ///< at low signal, if the scene has curvature
  double dark_offset_dn = 0.0;            ///< mean at zero exposure
  double read_noise_e = 0.0;              ///< rms over pixels, row noise included, jitter of the frame not
  double read_noise_dn = 0.0;
  double read_noise_median_e = 0.0;
  double row_noise_e = 0.0;
  double offset_jitter_dn = 0.0;
  double dsnu_e = 0.0;  ///< spread of dark level at zero exposure, all patterns
  double dsnu_row_e = 0.0, dsnu_column_e = 0.0, dsnu_pixel_e = 0.0;
  double prnu_percent = 0.0;  ///< spread of the response in per cent of its mean, all patterns
  double prnu_row_percent = 0.0, prnu_column_percent = 0.0, prnu_pixel_percent = 0.0;
  double prnu_with_vignetting_percent = 0.0;  ///< the same of response x illumination
  double mean_illumination = 1.0;             ///< mean of response x illumination, 1 at an ideal centre
  double dark_current_e_per_s = 0.0;          ///< mean over pixels, hot ones included
  double dark_current_median_e_per_s = 0.0;
  double dark_current_spread_e_per_s = 0.0;
  double saturation_dn = 0.0;          ///< signal above the dark offset at which the mean pixel saturates
  double saturation_capacity_e = 0.0;  ///< that in electrons of K
  /// Mean signal under even light at which 0.2 % of the pixels stand at the top code: below saturation_dn by
  /// 2.88 standard deviations of noise and patterns. Absent where the well limits or the signal is curved.
  std::optional<double> saturation_onset_dn;
  SaturationLimit saturation_limit = SaturationLimit::converter;
  std::size_t hot_pixel_count = 0;  ///< pixels that were given more dark current, however little
};

struct SeriesTruth {
  std::vector<double> scales;     ///< of the light, a number a frame
  std::vector<std::size_t> hits;  ///< a number a frame
  std::vector<double>
      mean_photo_e;  ///< a number a region: mean of light alone over pixels and frames, before full well
  std::vector<double> mean_dark_e;  ///< a number a region: mean of dark charge
};

/// One entry an amplifier, from left to right.
std::vector<RegionTruth> region_truths(const Sensor& sensor);

/// Of series `series`, index into the scene's.
SeriesTruth series_truth(const Sensor& sensor, const std::vector<RegionTruth>& regions, int series);

}  // namespace evenfield
