#include "simulate/truth.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>

#include "scenes.h"

namespace evenfield {
namespace {

using namespace testing;

TEST_CASE("What is called true of a region is what many of its frames show") {
  Scene scene = even_scene(4000.0, 96, 80);
  SceneCamera& camera = scene.camera;
  camera.gain_dn_per_e = 2.0;
  camera.read_noise_e = 4.0;
  camera.read_noise_spread = 0.4;
  camera.row_noise_e = 1.0;
  camera.dsnu_e = 6.0;
  camera.row_pattern_e = 2.0;
  camera.column_pattern_e = 3.0;
  camera.prnu_percent = 2.0;
  camera.row_pattern_percent = 0.5;
  camera.column_pattern_percent = 1.0;
  scene.light.vignetting = 0.3;
  scene.series.push_back(dark_scene().series.front());
  const Sensor sensor = realize(scene);
  const RegionTruth truth = region_truths(sensor).front();

  constexpr int kFrames = 60;
  std::vector<double> dark(96 * 80), squares(96 * 80), flat(96 * 80);
  for (int frame = 0; frame < kFrames; ++frame) {
    const auto dark_codes = expose(sensor, 1, frame), flat_codes = expose(sensor, 0, frame);
    for (std::size_t i = 0; i < dark.size(); ++i) {
      const double dark_dn = dark_codes[i], flat_dn = flat_codes[i];
      dark[i] += dark_dn / kFrames;
      squares[i] += dark_dn * dark_dn;
      flat[i] += (flat_dn - dark_dn) / kFrames;
    }
  }
  double temporal = 0.0;  // mean over pixels of the variance over frames
  for (std::size_t i = 0; i < dark.size(); ++i)
    temporal +=
        (squares[i] - kFrames * dark[i] * dark[i]) / (kFrames - 1.0) / static_cast<double>(dark.size());
  const Moments offset = moments_of(dark), light = moments_of(flat);
  const double quantization = 1.0 / 12.0;

  // Row noise makes the rows' 80 x 60 values the least known part; elsewhere 460800 values stand behind a
  // number.
  CHECK(std::abs(offset.mean - truth.dark_offset_dn) <
        4.0 * 2.0 * std::sqrt(17.0 / (96 * 80 * 60.0) + 1.0 / 4800.0));
  CHECK(std::sqrt(temporal - quantization) == doctest::Approx(truth.read_noise_dn).epsilon(0.01));
  CHECK(std::sqrt(temporal - quantization) / 2.0 == doctest::Approx(truth.read_noise_e).epsilon(0.01));
  CHECK(std::sqrt(offset.variance - temporal / kFrames) / 2.0 ==
        doctest::Approx(truth.dsnu_e).epsilon(0.005));
  const double flat_noise = (4.0 * light.mean / 2.0 + 2.0 * temporal) / kFrames;
  CHECK(100.0 * std::sqrt(light.variance - flat_noise) / light.mean ==
        doctest::Approx(truth.prnu_with_vignetting_percent).epsilon(0.005));
  CHECK(light.mean / 2.0 == doctest::Approx(4000.0 * truth.mean_illumination).epsilon(0.001));

  // The drawn parts, within 4 of their own standard errors of what the scene asks for: 1 / sqrt(2 n)
  // relative.
  CHECK(std::abs(truth.dsnu_row_e / 2.0 - 1.0) < 4.0 / std::sqrt(2.0 * 80));
  CHECK(std::abs(truth.dsnu_column_e / 3.0 - 1.0) < 4.0 / std::sqrt(2.0 * 96));
  CHECK(std::abs(truth.dsnu_pixel_e / 6.0 - 1.0) < 4.0 / std::sqrt(2.0 * 7680));
  CHECK(std::abs(truth.prnu_pixel_percent / 2.0 - 1.0) < 4.0 / std::sqrt(2.0 * 7680));
  CHECK(truth.prnu_percent > truth.prnu_pixel_percent);
  // Log-normal: rms = median x exp(spread^2), its row noise added in squares.
  CHECK(truth.read_noise_e == doctest::Approx(std::hypot(4.0 * std::exp(0.16), 1.0)).epsilon(0.04));
  CHECK(truth.read_noise_median_e == doctest::Approx(std::hypot(4.0, 1.0)).epsilon(0.03));
}

TEST_CASE("Saturation is the converter's or the well's, whichever comes first") {
  Scene scene = even_scene(100.0);
  scene.camera.bit_depth = 12;
  scene.camera.gain_dn_per_e = 0.5;
  scene.camera.offset_dn = 95.0;
  RegionTruth truth = region_truths(realize(scene)).front();
  CHECK(truth.saturation_limit == SaturationLimit::converter);
  CHECK(truth.saturation_dn == 4000.0);
  CHECK(truth.saturation_capacity_e == 8000.0);
  scene.camera.full_well_e = 6000.0;
  scene.camera.curvature = 0.05;
  truth = region_truths(realize(scene)).front();
  CHECK(truth.saturation_limit == SaturationLimit::well);
  CHECK(truth.saturation_dn == doctest::Approx(0.5 * 6000.0 * 0.95));
}

TEST_CASE("At the onset of saturation 0.2 % of the pixels stand at the top code") {
  Scene scene = even_scene(100.0, 512, 400);
  scene.camera.bit_depth = 12;
  scene.camera.gain_dn_per_e = 0.46;
  scene.camera.offset_dn = 100.0;
  scene.camera.read_noise_e = 3.0;
  scene.camera.dsnu_e = 5.0;
  scene.camera.prnu_percent = 0.8;
  const auto onset = region_truths(realize(scene)).front().saturation_onset_dn;
  REQUIRE(onset);
  scene.light.electrons_per_s = *onset / 0.46;
  const auto codes = expose(realize(scene), 0, 0);
  const auto at_top = static_cast<double>(std::count(codes.begin(), codes.end(), std::uint16_t{4095}));
  // Binomial, 409.6 expected; and 4 % for the skewness of Poisson numbers, which the normal quantile leaves
  // out: (z^2 - 1) / 6 x skewness x density / share = 1.2 x 0.009 x 3.17.
  CHECK(std::abs(at_top - 409.6) < 4.0 * std::sqrt(409.6) + 0.04 * 409.6);
  scene.camera.full_well_e = 3000.0;
  CHECK(!region_truths(realize(scene)).front().saturation_onset_dn);
}

TEST_CASE("DN of the truth are those of the file") {
  Scene scene = even_scene(100.0);
  scene.camera.bit_depth = 12;
  scene.camera.left_shift = 4;
  scene.camera.gain_dn_per_e = 0.5;
  scene.camera.offset_dn = 95.0;
  scene.camera.read_noise_e = 2.0;
  const RegionTruth truth = region_truths(realize(scene)).front();
  CHECK(truth.conversion_gain_dn_per_e == 8.0);
  CHECK(truth.dark_offset_dn == 1520.0);
  CHECK(truth.read_noise_dn == doctest::Approx(16.0));
  CHECK(truth.saturation_dn == 65520.0 - 1520.0);
  CHECK(truth.saturation_capacity_e == 8000.0);
}

TEST_CASE("A series' truth lists what its frames were given") {
  Scene scene = even_scene(500.0);
  scene.light.drift_percent = 2.0;
  scene.hits = {3.0, 100.0};
  scene.camera.dark_current_e_per_s = 7.0;
  scene.series.front().frames = 5;
  const Sensor sensor = realize(scene);
  const SeriesTruth truth = series_truth(sensor, region_truths(sensor), 0);
  REQUIRE(truth.scales.size() == 5);
  REQUIRE(truth.hits.size() == 5);
  double mean_scale = 0.0;
  for (int frame = 0; frame < 5; ++frame) {
    const FrameConditions own = frame_conditions(scene, 0, frame);
    CHECK(truth.scales[static_cast<std::size_t>(frame)] == own.scale);
    CHECK(truth.hits[static_cast<std::size_t>(frame)] == own.hits.size());
    mean_scale += own.scale / 5.0;
  }
  CHECK(truth.mean_photo_e.front() == doctest::Approx(500.0 * mean_scale));
  CHECK(truth.mean_dark_e.front() == doctest::Approx(7.0));
}

}  // namespace
}  // namespace evenfield
