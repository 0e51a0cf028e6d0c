#include "simulate/truth.h"

#include <algorithm>
#include <cmath>

#include "simulate/expose.h"

namespace evenfield {
namespace {

/// Mean and population spread of values that are all in memory; two passes, so nothing cancels.
struct Spread {
  double mean = 0.0, deviation = 0.0;
};

Spread spread_of(const std::vector<double>& values) {
  double sum = 0.0, squares = 0.0;
  for (const double value : values) sum += value;
  const double mean = sum / static_cast<double>(values.size());
  for (const double value : values) squares += (value - mean) * (value - mean);
  return {mean, std::sqrt(squares / static_cast<double>(values.size()))};
}

double median_of(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  if (values.size() % 2 == 1) return *middle;
  return (*middle + *std::max_element(values.begin(), middle)) / 2.0;
}

std::vector<double> part(const std::vector<float>& line, int start, int count) {
  return {line.begin() + start, line.begin() + start + count};
}

/// value(index, x, y) of each pixel of the region.
template <class Value>
std::vector<double> pixels_of(const Sensor& sensor, const Rect& rect, const Value& value) {
  std::vector<double> values;
  values.reserve(static_cast<std::size_t>(rect.width) * static_cast<std::size_t>(rect.height));
  for (int y = rect.y; y < rect.y + rect.height; ++y)
    for (int x = rect.x; x < rect.x + rect.width; ++x) {
      const auto column = static_cast<std::size_t>(x), row = static_cast<std::size_t>(y);
      values.push_back(value(row * static_cast<std::size_t>(sensor.scene.width) + column, column, row));
    }
  return values;
}

void add_dark_patterns(const Sensor& sensor, RegionTruth& truth) {
  const Rect& rect = truth.rect;
  const auto whole = [&](std::size_t i, std::size_t, std::size_t) { return double{sensor.offset_e[i]}; };
  const auto own = [&](std::size_t i, std::size_t x, std::size_t y) {
    return double{sensor.offset_e[i]} - sensor.row_offset_e[y] - sensor.column_offset_e[x];
  };
  const Spread offset = spread_of(pixels_of(sensor, rect, whole));
  truth.dark_offset_dn += truth.conversion_gain_dn_per_e * offset.mean;
  truth.dsnu_e = offset.deviation;
  truth.dsnu_row_e = spread_of(part(sensor.row_offset_e, rect.y, rect.height)).deviation;
  truth.dsnu_column_e = spread_of(part(sensor.column_offset_e, rect.x, rect.width)).deviation;
  truth.dsnu_pixel_e = spread_of(pixels_of(sensor, rect, own)).deviation;
}

void add_response(const Sensor& sensor, RegionTruth& truth) {
  const Rect& rect = truth.rect;
  const auto whole = [&](std::size_t i, std::size_t, std::size_t) { return double{sensor.response[i]}; };
  const auto lit = [&](std::size_t i, std::size_t, std::size_t) {
    return double{sensor.response[i]} * sensor.illumination[i];
  };
  const auto own = [&](std::size_t i, std::size_t x, std::size_t y) {
    return double{sensor.response[i]} - sensor.row_response[y] - sensor.column_response[x];
  };
  const Spread response = spread_of(pixels_of(sensor, rect, whole)),
               light = spread_of(pixels_of(sensor, rect, lit));
  const double percent = response.mean > 0.0 ? 100.0 / response.mean : 0.0;
  truth.prnu_percent = response.deviation * percent;
  truth.prnu_row_percent = spread_of(part(sensor.row_response, rect.y, rect.height)).deviation * percent;
  truth.prnu_column_percent = spread_of(part(sensor.column_response, rect.x, rect.width)).deviation * percent;
  truth.prnu_pixel_percent = spread_of(pixels_of(sensor, rect, own)).deviation * percent;
  truth.prnu_with_vignetting_percent = light.mean > 0.0 ? 100.0 * light.deviation / light.mean : 0.0;
  truth.mean_illumination = light.mean;
}

void add_noise(const Sensor& sensor, RegionTruth& truth) {
  const double row_e = sensor.scene.camera.row_noise_e;
  std::vector<double> noise = pixels_of(sensor, truth.rect, [&](std::size_t i, std::size_t, std::size_t) {
    return std::hypot(double{sensor.read_noise_e[i]}, row_e);
  });
  double squares = 0.0;
  for (const double value : noise) squares += value * value;
  truth.read_noise_e = std::sqrt(squares / static_cast<double>(noise.size()));
  truth.read_noise_dn = truth.read_noise_e * truth.conversion_gain_dn_per_e;
  truth.read_noise_median_e = median_of(std::move(noise));
  truth.row_noise_e = row_e;
}

void add_dark_current(const Sensor& sensor, RegionTruth& truth) {
  std::vector<double> rates = pixels_of(sensor, truth.rect, [&](std::size_t i, std::size_t, std::size_t) {
    return double{sensor.dark_e_per_s[i]};
  });
  const Spread rate = spread_of(rates);
  truth.dark_current_e_per_s = rate.mean;
  truth.dark_current_spread_e_per_s = rate.deviation;
  truth.dark_current_median_e_per_s = median_of(std::move(rates));
  truth.hot_pixel_count = static_cast<std::size_t>(std::count_if(
      sensor.hot_pixels.begin(), sensor.hot_pixels.end(),
      [&](const HotPixel& hot) { return hot.x >= truth.rect.x && hot.x < truth.rect.x + truth.rect.width; }));
}

void add_saturation(const SceneCamera& camera, RegionTruth& truth) {
  const double top_dn = std::ldexp(std::ldexp(1.0, camera.bit_depth) - 1.0, camera.left_shift);
  truth.saturation_dn = top_dn - truth.dark_offset_dn;
  if (camera.full_well_e) {
    const double well_dn = truth.conversion_gain_dn_per_e * *camera.full_well_e * (1.0 - camera.curvature);
    if (well_dn < truth.saturation_dn) {
      truth.saturation_dn = well_dn;
      truth.saturation_limit = SaturationLimit::well;
    }
  }
  truth.saturation_capacity_e = truth.saturation_dn / truth.conversion_gain_dn_per_e;
}

/// The signal S at which S + z x spread(S) reaches the top code, found by bisection: the sum rises with S.
std::optional<double> saturation_onset_dn(const SceneCamera& camera, const RegionTruth& truth) {
  if (truth.saturation_limit == SaturationLimit::well || camera.curvature > 0.0) return std::nullopt;
  constexpr double kQuantile = 2.878162;  // of the normal distribution, 0.2 % above
  const double gain = truth.conversion_gain_dn_per_e;
  const double dark_e = std::hypot(truth.read_noise_e, truth.dsnu_e);
  // A code rounds up to the top from half a step below it.
  const double top_dn = truth.saturation_dn - std::ldexp(0.5, camera.left_shift);
  double low = 0.0, high = truth.saturation_dn;
  for (int step = 0; step < 60; ++step) {
    const double signal_dn = (low + high) / 2.0, signal_e = signal_dn / gain;
    const double photon_e = std::sqrt(signal_e), pattern_e = truth.prnu_percent / 100.0 * signal_e;
    const double spread_dn = gain * std::hypot(dark_e, photon_e, pattern_e);
    (signal_dn + kQuantile * spread_dn < top_dn ? low : high) = signal_dn;
  }
  return (low + high) / 2.0;
}

}  // namespace

std::vector<RegionTruth> region_truths(const Sensor& sensor) {
  const Scene& scene = sensor.scene;
  std::vector<RegionTruth> truths;
  for (const SceneAmplifier& amplifier : scene.amplifiers) {
    RegionTruth truth;
    truth.name = amplifier.name;
    truth.rect = {amplifier.x, 0, amplifier.width, scene.height};
    truth.conversion_gain_dn_per_e = std::ldexp(gain_dn_per_e_of(scene, amplifier), scene.camera.left_shift);
    truth.dark_offset_dn = std::ldexp(offset_dn_of(scene, amplifier), scene.camera.left_shift);
    truth.offset_jitter_dn = std::ldexp(scene.camera.offset_jitter_dn, scene.camera.left_shift);
    add_dark_patterns(sensor, truth);
    add_response(sensor, truth);
    add_noise(sensor, truth);
    add_dark_current(sensor, truth);
    add_saturation(scene.camera, truth);
    truth.saturation_onset_dn = saturation_onset_dn(scene.camera, truth);
    truths.push_back(std::move(truth));
  }
  return truths;
}

SeriesTruth series_truth(const Sensor& sensor, const std::vector<RegionTruth>& regions, int series) {
  const Scene& scene = sensor.scene;
  const SceneSeries& taken = scene.series.at(static_cast<std::size_t>(series));
  SeriesTruth truth;
  double sum = 0.0;
  for (int frame = 0; frame < taken.frames; ++frame) {
    const FrameConditions own = frame_conditions(scene, series, frame);
    truth.scales.push_back(own.scale);
    truth.hits.push_back(own.hits.size());
    sum += own.scale;
  }
  const double exposure_s = taken.conditions.exposure_s.value_or(0.0);
  const double light_e =
      light_of(taken) * exposure_s * scene.light.electrons_per_s * sum / static_cast<double>(taken.frames);
  for (const RegionTruth& region : regions) {
    truth.mean_photo_e.push_back(light_e * region.mean_illumination);
    truth.mean_dark_e.push_back(exposure_s * region.dark_current_e_per_s);
  }
  return truth;
}

}  // namespace evenfield
