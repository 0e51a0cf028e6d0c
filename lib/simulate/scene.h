#pragma once
/// A scene: a camera whose every parameter is known, the light on it, and the series of frames to take.
///
/// Units stand in the names; `dn` here are codes of the converter, before left_shift moves them up in the
/// file. All random numbers follow from the two seeds: `camera.seed` fixes the sensor (its maps), `seed` what
/// changes from frame to frame, so that one camera can be visited many times. How SCENE.toml spells a scene:
/// scene_reader.h.

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "base/conditions.h"
#include "formats/frame_writer.h"

namespace evenfield {

struct SceneCamera {
  std::optional<std::string> label, serial, mode;
  std::string detector = "cmos";
  std::uint64_t seed = 1;
  int bit_depth = 12;
  int left_shift = 0;  ///< bits by which codes are moved up in the 16-bit file
  double offset_dn = 0.0;
  double gain_dn_per_e = 1.0;
  std::optional<double> full_well_e;  ///< charge beyond it is lost; absent: the converter limits
  double curvature = 0.0;          ///< share of the signal that is lost at full well, quadratic in the charge
  double read_noise_e = 0.0;       ///< median over pixels
  double read_noise_spread = 0.0;  ///< standard deviation of ln(read noise) over pixels
  double row_noise_e = 0.0;        ///< drawn for each row of each frame
  double offset_jitter_dn = 0.0;   ///< drawn for each frame
  double dsnu_e = 0.0, row_pattern_e = 0.0, column_pattern_e = 0.0;  ///< fixed, additive; rms
  double prnu_percent = 0.0, row_pattern_percent = 0.0, column_pattern_percent = 0.0;  ///< fixed, of response
  double dark_current_e_per_s = 0.0;
  double hot_fraction = 0.0;      ///< share of pixels with more dark current than that
  double hot_rate_e_per_s = 0.0;  ///< mean of the exponential distribution of what they have more
  std::optional<double> pixel_pitch_um;
  std::optional<double> quantum_efficiency;  ///< electrons per photon
};

/// Columns [x, x + width) over the whole height; what is absent is the camera's.
struct SceneAmplifier {
  std::string name;
  int x = 0;
  int width = 0;
  std::optional<double> offset_dn, gain_dn_per_e, read_noise_e;
};

struct SceneLight {
  double electrons_per_s = 0.0;  ///< mean at the centre of the frame at light = 1
  std::optional<double> irradiance_w_per_m2, wavelength_nm;
  std::optional<double> irradiance_relative_standard_uncertainty, level_relative_standard_uncertainty;
  double vignetting = 0.0;  ///< relative fall-off at the corners, quadratic in the distance from the centre
  double drift_percent = 0.0;  ///< rms of each frame's scale, independent from frame to frame
  double trend_percent = 0.0;  ///< change of the scale from the first flat frame of the session to the last
};

/// Single pixels struck by particles, in any frame.
struct SceneHits {
  double per_frame = 0.0;  ///< Poisson mean
  double mean_e = 0.0;     ///< of the exponential distribution of the charge
};

struct SceneSeries {
  Conditions conditions;  ///< exposure_s is always there; light counts for flats only
  int frames = 1;
  std::string name;  ///< "flat_03": kind and number among its kind, from 1; file names begin with it
};

struct SceneOutput {
  WriteFormat format = WriteFormat::tiff;
  WriteCompression compression = WriteCompression::none;
  bool stacks = true;       ///< one file a series; else one a frame
  bool extensions = false;  ///< FITS stacks as extensions instead of a cube
};

struct Scene {
  std::uint64_t seed = 1;
  std::optional<std::string> acquired;  ///< RFC 3339 in UTC
  int width = 0, height = 0;
  SceneCamera camera;
  std::vector<SceneAmplifier> amplifiers;  ///< at least one; they tile the columns from left to right
  bool amplifiers_listed = false;          ///< else the one there is was made up, and is named "whole"
  SceneLight light;
  SceneHits hits;
  std::vector<SceneSeries> series;
  SceneOutput output;
};

/// Gives each series its name, from its kind and place.
void name_series(Scene& scene);

/// Relative light on the frames of a series; 0 for darks and biases, which are taken behind a shutter.
double light_of(const SceneSeries& series);

/// Suffix of frame files, ".tif" or ".fits".
std::string frame_suffix(const SceneOutput& output);

/// Names of the files of a series, in the order of frames.
std::vector<std::string> frame_file_names(const Scene& scene, const SceneSeries& series);

}  // namespace evenfield
