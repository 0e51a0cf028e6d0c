#include "simulate/sensor.h"

#include <algorithm>
#include <cmath>

#include "simulate/random.h"

namespace evenfield {
namespace {

std::vector<float> normal_values(int count, double sigma, std::uint64_t seed, Stream stream) {
  std::vector<float> values(static_cast<std::size_t>(count), 0.0F);
  if (sigma == 0.0) return values;
  Engine engine = engine_for(seed, stream);
  for (float& value : values) value = static_cast<float>(sigma * standard_normal(engine));
  return values;
}

/// Calls visit(index, x, y) for each pixel in reading order.
template <class Visit>
void for_each_pixel(const Scene& scene, const Visit& visit) {
  std::size_t index = 0;
  for (int y = 0; y < scene.height; ++y)
    for (int x = 0; x < scene.width; ++x)
      visit(index++, static_cast<std::size_t>(x), static_cast<std::size_t>(y));
}

std::vector<float> response_of(const Sensor& sensor) {
  const Scene& scene = sensor.scene;
  Engine engine = engine_for(scene.camera.seed, Stream::response);
  const double sigma = scene.camera.prnu_percent / 100.0;
  std::vector<float> response(sensor.illumination.size());
  for_each_pixel(scene, [&](std::size_t index, std::size_t x, std::size_t y) {
    const double own = sigma == 0.0 ? 0.0 : sigma * standard_normal(engine);
    response[index] =
        static_cast<float>(std::max(0.0, 1.0 + own + sensor.row_response[y] + sensor.column_response[x]));
  });
  return response;
}

/// Quadratic in the distance from the middle of the frame; the centres of the corner pixels lose it all.
std::vector<float> illumination_of(const Scene& scene) {
  std::vector<float> illumination(static_cast<std::size_t>(scene.width) *
                                  static_cast<std::size_t>(scene.height));
  const double middle_x = (scene.width - 1) / 2.0, middle_y = (scene.height - 1) / 2.0;
  const double corner = middle_x * middle_x + middle_y * middle_y;
  for_each_pixel(scene, [&](std::size_t index, std::size_t x, std::size_t y) {
    const double dx = static_cast<double>(x) - middle_x, dy = static_cast<double>(y) - middle_y;
    illumination[index] = static_cast<float>(
        1.0 - (corner > 0.0 ? scene.light.vignetting * (dx * dx + dy * dy) / corner : 0.0));
  });
  return illumination;
}

std::vector<float> offset_of(const Sensor& sensor) {
  const Scene& scene = sensor.scene;
  Engine engine = engine_for(scene.camera.seed, Stream::offset);
  std::vector<float> offset(sensor.illumination.size());
  for_each_pixel(scene, [&](std::size_t index, std::size_t x, std::size_t y) {
    const double own = scene.camera.dsnu_e == 0.0 ? 0.0 : scene.camera.dsnu_e * standard_normal(engine);
    offset[index] = static_cast<float>(own + sensor.row_offset_e[y] + sensor.column_offset_e[x]);
  });
  return offset;
}

std::vector<float> read_noise_of(const Scene& scene) {
  Engine engine = engine_for(scene.camera.seed, Stream::read_noise);
  std::vector<float> median(static_cast<std::size_t>(scene.width));
  for (const SceneAmplifier& amplifier : scene.amplifiers)
    std::fill_n(median.begin() + amplifier.x, amplifier.width,
                static_cast<float>(read_noise_e_of(scene, amplifier)));
  std::vector<float> noise(median.size() * static_cast<std::size_t>(scene.height));
  const double spread = scene.camera.read_noise_spread;
  for_each_pixel(scene, [&](std::size_t index, std::size_t x, std::size_t) {
    noise[index] = spread == 0.0 ? median[x]
                                 : static_cast<float>(median[x] * std::exp(spread * standard_normal(engine)));
  });
  return noise;
}

void add_hot_pixels(Sensor& sensor) {
  const SceneCamera& camera = sensor.scene.camera;
  sensor.dark_e_per_s.assign(sensor.illumination.size(), static_cast<float>(camera.dark_current_e_per_s));
  if (camera.hot_fraction == 0.0) return;
  Engine engine = engine_for(camera.seed, Stream::hot_pixels);
  for_each_pixel(sensor.scene, [&](std::size_t index, std::size_t x, std::size_t y) {
    if (uniform(engine) >= camera.hot_fraction) return;
    const double rate = exponential(engine, camera.hot_rate_e_per_s);
    sensor.hot_pixels.push_back({static_cast<int>(x), static_cast<int>(y), rate});
    sensor.dark_e_per_s[index] += static_cast<float>(rate);
  });
}

}  // namespace

double offset_dn_of(const Scene& scene, const SceneAmplifier& amplifier) {
  return amplifier.offset_dn.value_or(scene.camera.offset_dn);
}

double gain_dn_per_e_of(const Scene& scene, const SceneAmplifier& amplifier) {
  return amplifier.gain_dn_per_e.value_or(scene.camera.gain_dn_per_e);
}

double read_noise_e_of(const Scene& scene, const SceneAmplifier& amplifier) {
  return amplifier.read_noise_e.value_or(scene.camera.read_noise_e);
}

Sensor realize(const Scene& scene) {
  const SceneCamera& camera = scene.camera;
  Sensor sensor;
  sensor.scene = scene;
  sensor.row_offset_e = normal_values(scene.height, camera.row_pattern_e, camera.seed, Stream::row_offset);
  sensor.column_offset_e =
      normal_values(scene.width, camera.column_pattern_e, camera.seed, Stream::column_offset);
  sensor.row_response =
      normal_values(scene.height, camera.row_pattern_percent / 100.0, camera.seed, Stream::row_response);
  sensor.column_response =
      normal_values(scene.width, camera.column_pattern_percent / 100.0, camera.seed, Stream::column_response);
  sensor.illumination = illumination_of(scene);
  sensor.response = response_of(sensor);
  sensor.offset_e = offset_of(sensor);
  sensor.read_noise_e = read_noise_of(scene);
  add_hot_pixels(sensor);
  return sensor;
}

}  // namespace evenfield
