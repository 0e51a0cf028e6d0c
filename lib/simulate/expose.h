#pragma once
/// One frame of a realized sensor.
///
///   charge = min(full well, Poisson(light x exposure x rate x illumination x response x frame scale
///                                   + dark current x exposure) + hit)                              [e-]
///   signal = charge x (1 - curvature x charge / full well)                                         [e-]
///   code   = floor(offset + K x (signal + fixed offset + read noise + row noise) + jitter + 1/2)
///
/// so a half rounds up; codes are clipped to 0 .. 2^bit_depth - 1 and then moved up by left_shift bits.
/// Photon noise is Poisson, all other noise is normal.

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "simulate/sensor.h"

namespace evenfield {

struct Hit {
  std::size_t pixel = 0;  ///< index in reading order
  double charge_e = 0.0;
};

/// What one frame has of its own, beside its pixels' noise.
struct FrameConditions {
  double scale = 1.0;  ///< of the light
  double jitter_dn = 0.0;
  std::vector<Hit> hits;  ///< ascending by pixel; a pixel may be struck twice
};

/// Of frame `frame` (from 0) of series `series` (index into scene.series). Frames beyond the series' number
/// may be asked for: a test draws as many as it needs.
FrameConditions frame_conditions(const Scene& scene, int series, int frame);

/// That frame's codes as they stand in a file, rows first. The answer depends on nothing but the arguments.
std::vector<std::uint16_t> expose(const Sensor& sensor, int series, int frame);

/// The same into `codes` of width x height.
void expose(const Sensor& sensor, int series, int frame, std::span<std::uint16_t> codes);

}  // namespace evenfield
