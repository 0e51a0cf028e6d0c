#pragma once
/// Scenes for the tests of the simulator, each with one effect and nothing else.

#include <cmath>
#include <cstdint>
#include <vector>

#include "simulate/expose.h"
#include "simulate/scene.h"
#include "simulate/sensor.h"

namespace evenfield::testing {

/// A noiseless 16-bit camera of K = 1 DN/e- and offset 1000, one flat series of mean `mean_e` in all pixels.
inline Scene even_scene(double mean_e, int width = 128, int height = 96) {
  Scene scene;
  scene.width = width;
  scene.height = height;
  scene.camera.bit_depth = 16;
  scene.camera.offset_dn = 1000.0;
  scene.amplifiers = {{"whole", 0, width, {}, {}, {}}};
  scene.light.electrons_per_s = mean_e;
  SceneSeries flat;
  flat.conditions.exposure_s = 1.0;
  flat.frames = 2;
  scene.series = {flat};
  name_series(scene);
  return scene;
}

/// The same without light.
inline Scene dark_scene(int width = 128, int height = 96) {
  Scene scene = even_scene(0.0, width, height);
  scene.series.front().conditions.kind = SeriesKind::dark;
  name_series(scene);
  return scene;
}

struct Moments {
  double count = 0.0, mean = 0.0, variance = 0.0;  ///< variance with count - 1
};

template <class Values>
Moments moments_of(const Values& values) {
  Moments out;
  out.count = static_cast<double>(values.size());
  for (const auto value : values) out.mean += static_cast<double>(value) / out.count;
  for (const auto value : values) {
    const double off = static_cast<double>(value) - out.mean;
    out.variance += off * off / (out.count - 1.0);
  }
  return out;
}

/// Difference of two frames, pixel by pixel: free of everything that is fixed.
inline std::vector<double> difference(const std::vector<std::uint16_t>& a,
                                      const std::vector<std::uint16_t>& b) {
  std::vector<double> out(a.size());
  for (std::size_t i = 0; i < a.size(); ++i) out[i] = static_cast<double>(a[i]) - static_cast<double>(b[i]);
  return out;
}

/// Standard error of a variance found from `count` normal values, relative (Cochran's theorem: 2 / (n - 1)).
inline double variance_error(double count) { return std::sqrt(2.0 / (count - 1.0)); }

}  // namespace evenfield::testing
