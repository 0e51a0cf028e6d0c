#pragma once
/// Reads SCENE.toml. Every key, with its unit, its default and its limits:
///
///   schema = 1                        required
///   seed = 1                          of all that changes from frame to frame; 0 to 2^63 - 1
///   acquired = 2026-11-24T09:30:00Z   optional; goes into the session file and FITS headers
///
///   [frame]                           required
///   width = 640                       8 to 65535 pixels
///   height = 480                      8 to 65535; at most 100 million pixels in all
///
///   [camera]                          required
///   label, serial, mode               optional texts, for the session file
///   detector = "cmos"                 cmos | ccd
///   seed = 1                          of the fixed patterns; default: the seed above. The same camera with
///   another
///                                     `seed` above is the same sensor on another day
///   bit_depth = 12                    required; 1 to 16 bits of the converter
///   left_shift = 0                    bits by which codes are moved up in the 16-bit file
///   offset_dn = 100.0                 required; 0 to the largest code, in codes before left_shift
///   gain_dn_per_e = 0.5               required; above 0; codes before left_shift per electron
///   full_well_e = 9000                optional; charge beyond it is lost; without it the converter limits
///   curvature = 0.0                   0 to 0.5: share of the signal lost at full_well_e, quadratic in the
///   charge read_noise_e = 2.0                required; from 0; median over pixels read_noise_spread = 0.0 0
///   to 2: standard deviation of ln(read noise) over pixels row_noise_e = 0.0                 temporal,
///   shared by a row of one frame offset_jitter_dn = 0.0            temporal, shared by a frame dsnu_e = 0.0
///   fixed, additive, of each pixel row_pattern_e = 0.0               fixed, additive, shared by a row
///   column_pattern_e = 0.0            fixed, additive, shared by a column
///   prnu_percent = 0.0                fixed, of the response, of each pixel; 0 to 50, as the next two
///   row_pattern_percent = 0.0
///   column_pattern_percent = 0.0
///   dark_current_e_per_s = 0.0        of every pixel
///   hot_fraction = 0.0                0 to 1: share of pixels that have more dark current
///   hot_rate_e_per_s = 0.0            mean of what they have more (exponential distribution)
///   pixel_pitch_um = 6.5              optional
///   quantum_efficiency = 0.7          optional; above 0, at most 1
///
///   [[amplifier]]                     optional; from left to right, together as wide as the frame
///   name = "left"                     required; becomes a region of the session
///   width = 320                       required; columns, at least 8
///   x = 0                             optional; must be where the one before ends
///   offset_dn, gain_dn_per_e, read_noise_e      optional, over the camera's
///
///   [light]                           required if there are flats
///   electrons_per_s_at_1 = 1e5        mean electrons per second at the centre at light = 1; or instead
///   irradiance_w_per_m2 = 2.1e-3      at the centre at light = 1; needs wavelength_nm, pixel_pitch_um and
///                                     quantum_efficiency. Where all three are given, the one follows from
///                                     the other, and the session file states the irradiance
///   wavelength_nm = 530               optional
///   irradiance_relative_standard_uncertainty, level_relative_standard_uncertainty   for the session file
///   vignetting = 0.0                  0 to 1: relative fall-off at the corners
///   drift_percent = 0.0               0 to 50: rms of the scale of each frame
///   trend_percent = 0.0               -90 to 100: change of the scale from the first flat frame to the last
///
///   [hits]                            particles that strike single pixels, in all frames
///   per_frame = 0.0                   Poisson mean; at most a million
///   mean_e = 0.0                      mean charge (exponential distribution)
///
///   [[series]]                        at least one
///   kind = "flat"                     required; flat | dark | bias
///   exposure_s = 0.01                 required, but for a bias, where it is 0
///   exposures_s = [0.01, 0.02]        instead of it: one series each
///   light = 1.0                       relative; flats only; default 1
///   lights = [0.5, 1.0]               instead of it: one series each; not together with exposures_s
///   frames = 2                        required; 1 to 100000; at most a million in all
///   temperature_c = -10.0             optional, for the record
///
///   [output]                          optional
///   format = "tiff"                   tiff | fits
///   stacks = true                     one file a series; false: one a frame
///   compression = "none"              none | deflate | lzw | packbits for tiff; none | rice | gzip for fits
///   extensions = false                fits stacks: an image extension a frame instead of a cube
///
/// Rates and noises are at least 0 and at most 1e9.

#include <filesystem>
#include <optional>
#include <string_view>

#include "base/error.h"
#include "simulate/scene.h"

namespace evenfield {

/// Errors (input) name file, line and key: whatever breaks the limits above, an unknown key, or a mean of
/// more than 1e8 electrons in a pixel. `format`, if given, takes the place of output.format.
Result<Scene> read_scene(const std::filesystem::path& file, std::optional<WriteFormat> format = std::nullopt);

/// The same from text; `name` stands for the file in errors.
Result<Scene> read_scene_text(std::string_view text,
                              const std::filesystem::path& name,
                              std::optional<WriteFormat> format = std::nullopt);

}  // namespace evenfield
