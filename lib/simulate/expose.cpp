#include "simulate/expose.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <limits>

#include "simulate/random.h"

namespace evenfield {
namespace {

const SceneSeries& series_at(const Scene& scene, int series) {
  return scene.series.at(static_cast<std::size_t>(series));
}

/// How far the session has come at this frame, from 0 at its first flat frame to 1 at its last.
double session_progress(const Scene& scene, int series, int frame) {
  double before = 0.0, total = 0.0;
  for (int index = 0; index < static_cast<int>(scene.series.size()); ++index) {
    const SceneSeries& each = series_at(scene, index);
    if (each.conditions.kind != SeriesKind::flat) continue;
    total += each.frames;
    if (index < series) before += each.frames;
  }
  return total > 1.0 ? (before + frame) / (total - 1.0) : 0.0;
}

/// From charge to the code of the file; of one amplifier in one frame.
struct Readout {
  double offset_dn, gain_dn_per_e, full_well_e, loss_per_e, top_code;
  int left_shift;

  std::uint16_t code(double charge_e, double added_e) const {
    const double charge = std::min(charge_e, full_well_e);
    const double signal = charge - loss_per_e * charge * charge;
    const double rounded = std::floor(offset_dn + gain_dn_per_e * (signal + added_e) + 0.5);
    const auto clipped = static_cast<unsigned>(std::clamp(rounded, 0.0, top_code));
    return static_cast<std::uint16_t>(clipped << static_cast<unsigned>(left_shift));
  }
};

Readout readout_of(const Scene& scene, const SceneAmplifier& amplifier, double jitter_dn) {
  const SceneCamera& camera = scene.camera;
  return {offset_dn_of(scene, amplifier) + jitter_dn,
          gain_dn_per_e_of(scene, amplifier),
          camera.full_well_e.value_or(std::numeric_limits<double>::infinity()),
          camera.full_well_e ? camera.curvature / *camera.full_well_e : 0.0,
          std::ldexp(1.0, camera.bit_depth) - 1.0,
          camera.left_shift};
}

}  // namespace

FrameConditions frame_conditions(const Scene& scene, int series, int frame) {
  Engine engine = engine_for(scene.seed, Stream::frame_conditions, static_cast<std::uint64_t>(series),
                             static_cast<std::uint64_t>(frame));
  FrameConditions conditions;
  // Always drawn, so that one parameter of a scene does not change what is drawn for another.
  const double drift = standard_normal(engine), jitter = standard_normal(engine);
  conditions.jitter_dn = scene.camera.offset_jitter_dn * jitter;
  if (series_at(scene, series).conditions.kind == SeriesKind::flat)
    conditions.scale =
        std::max(0.0, (1.0 + scene.light.drift_percent / 100.0 * drift) *
                          (1.0 + scene.light.trend_percent / 100.0 * session_progress(scene, series, frame)));
  const std::int64_t hits = poisson(engine, scene.hits.per_frame);
  const auto pixels = static_cast<double>(scene.width) * static_cast<double>(scene.height);
  for (std::int64_t hit = 0; hit < hits; ++hit) {
    const auto pixel = static_cast<std::size_t>(uniform(engine) * pixels);
    conditions.hits.push_back({pixel, exponential(engine, scene.hits.mean_e)});
  }
  std::stable_sort(conditions.hits.begin(), conditions.hits.end(),
                   [](const Hit& a, const Hit& b) { return a.pixel < b.pixel; });
  return conditions;
}

void expose(const Sensor& sensor, int series, int frame, std::span<std::uint16_t> codes) {
  const Scene& scene = sensor.scene;
  assert(codes.size() == sensor.response.size());
  const SceneSeries& taken = series_at(scene, series);
  const FrameConditions own = frame_conditions(scene, series, frame);
  const double exposure_s = taken.conditions.exposure_s.value_or(0.0);
  const double light_e = light_of(taken) * exposure_s * scene.light.electrons_per_s * own.scale;
  std::vector<Readout> readouts;
  for (const SceneAmplifier& amplifier : scene.amplifiers)
    readouts.push_back(readout_of(scene, amplifier, own.jitter_dn));

  Engine engine = engine_for(scene.seed, Stream::frame_pixels, static_cast<std::uint64_t>(series),
                             static_cast<std::uint64_t>(frame));
  auto hit = own.hits.begin();
  std::size_t pixel = 0;
  for (int y = 0; y < scene.height; ++y) {
    const double row_e =
        scene.camera.row_noise_e == 0.0 ? 0.0 : scene.camera.row_noise_e * standard_normal(engine);
    for (std::size_t part = 0; part < readouts.size(); ++part) {
      const Readout readout = readouts[part];
      for (const std::size_t end = pixel + static_cast<std::size_t>(scene.amplifiers[part].width);
           pixel < end; ++pixel) {
        const double mean_e = light_e * sensor.illumination[pixel] * sensor.response[pixel] +
                              sensor.dark_e_per_s[pixel] * exposure_s;
        auto charge_e = static_cast<double>(poisson(engine, mean_e));
        for (; hit != own.hits.end() && hit->pixel == pixel; ++hit) charge_e += hit->charge_e;
        const double noise_e =
            sensor.read_noise_e[pixel] == 0.0F ? 0.0 : sensor.read_noise_e[pixel] * standard_normal(engine);
        codes[pixel] = readout.code(charge_e, sensor.offset_e[pixel] + noise_e + row_e);
      }
    }
  }
}

std::vector<std::uint16_t> expose(const Sensor& sensor, int series, int frame) {
  std::vector<std::uint16_t> codes(sensor.response.size());
  expose(sensor, series, frame, codes);
  return codes;
}

}  // namespace evenfield
