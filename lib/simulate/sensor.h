#pragma once
/// The sensor of a scene, realized: what is fixed for each pixel. Maps are width x height, rows first.

#include <vector>

#include "simulate/scene.h"

namespace evenfield {

struct HotPixel {
  int x = 0;
  int y = 0;
  double rate_e_per_s = 0.0;  ///< beyond the dark current of all pixels
};

struct Sensor {
  Scene scene;
  std::vector<float> response;         ///< relative, near 1; fixed patterns included, uneven light not
  std::vector<float> illumination;     ///< relative light, 1 at the centre of the frame
  std::vector<float> offset_e;         ///< dark level at zero exposure less the amplifier's, in electrons
  std::vector<float> dark_e_per_s;     ///< dark current
  std::vector<float> read_noise_e;     ///< standard deviation from frame to frame, row noise not included
  std::vector<float> row_offset_e;     ///< for each row, the part of offset_e that it shares
  std::vector<float> column_offset_e;  ///< for each column
  std::vector<float> row_response;     ///< for each row, the part of response - 1 that it shares
  std::vector<float> column_response;  ///< for each column
  std::vector<HotPixel> hot_pixels;    ///< in reading order
};

/// Draws the sensor of `scene` from scene.camera.seed. Fixed patterns are normal; read noise is log-normal
/// about its median; a response below 0 is 0. Takes about 20 bytes a pixel.
Sensor realize(const Scene& scene);

/// An amplifier's own value, else the camera's.
double offset_dn_of(const Scene& scene, const SceneAmplifier& amplifier);
double gain_dn_per_e_of(const Scene& scene, const SceneAmplifier& amplifier);
double read_noise_e_of(const Scene& scene, const SceneAmplifier& amplifier);

}  // namespace evenfield
