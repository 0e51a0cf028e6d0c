#include "simulate/expose.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "scenes.h"

namespace evenfield {
namespace {

using namespace testing;

// Limits below are 4 standard errors of what is estimated; all seeds are fixed, so a pass stays one.

TEST_CASE("Mean and variance of flats follow gain, offset, photon and read noise over many seeds") {
  const double gain = 0.46, read_e = 3.0, mean_e = 2500.0;
  const double variance_dn2 = gain * gain * (mean_e + read_e * read_e) + 1.0 / 12.0;  // rounding: 1/12
  double pull_of_mean = 0.0, pull_of_variance = 0.0;
  const int seeds = 40;
  for (int seed = 0; seed < seeds; ++seed) {
    Scene scene = even_scene(mean_e, 64, 48);
    scene.seed = static_cast<std::uint64_t>(seed);
    scene.camera.gain_dn_per_e = gain;
    scene.camera.read_noise_e = read_e;
    const Moments frame = moments_of(expose(realize(scene), 0, 0));
    pull_of_mean += (frame.mean - (1000.0 + gain * mean_e)) / std::sqrt(variance_dn2 / frame.count);
    pull_of_variance += (frame.variance / variance_dn2 - 1.0) / variance_error(frame.count);
  }
  CHECK(std::abs(pull_of_mean) < 4.0 * std::sqrt(seeds));
  CHECK(std::abs(pull_of_variance) < 4.0 * std::sqrt(seeds));
}

TEST_CASE("At a few electrons a frame holds the share of empty pixels that Poisson says") {
  const double mean_e = 0.7;
  const auto codes = expose(realize(even_scene(mean_e, 256, 256)), 0, 0);
  const double count = static_cast<double>(codes.size());
  for (int electrons = 0; electrons < 4; ++electrons) {
    CAPTURE(electrons);
    const double expected = std::exp(-mean_e) * std::pow(mean_e, electrons) / std::tgamma(electrons + 1.0);
    const auto seen = std::count(codes.begin(), codes.end(), static_cast<std::uint16_t>(1000 + electrons));
    CHECK(std::abs(static_cast<double>(seen) - count * expected) <
          4.0 * std::sqrt(count * expected * (1 - expected)));
  }
}

TEST_CASE("No light falls on a dark, whatever the scene's light") {
  Scene scene = even_scene(5000.0);
  scene.series.front().conditions.kind = SeriesKind::dark;
  for (const std::uint16_t code : expose(realize(scene), 0, 0)) REQUIRE(code == 1000);
}

TEST_CASE("Dark charge grows with exposure and carries its shot noise") {
  Scene scene = dark_scene();
  scene.camera.dark_current_e_per_s = 40.0;
  scene.series.front().conditions.exposure_s = 5.0;
  const Moments frame = moments_of(expose(realize(scene), 0, 0));
  CHECK(std::abs(frame.mean - 1200.0) < 4.0 * std::sqrt(200.0 / frame.count));
  CHECK(std::abs(frame.variance / 200.0 - 1.0) < 4.0 * variance_error(frame.count));
}

TEST_CASE("Hot pixels are as many as asked for and have more dark current, alike in every frame") {
  Scene scene = dark_scene(256, 256);
  scene.camera.hot_fraction = 0.01;
  scene.camera.hot_rate_e_per_s = 500.0;
  const Sensor sensor = realize(scene);
  const auto hot = static_cast<double>(sensor.hot_pixels.size());
  CHECK(std::abs(hot - 655.36) < 4.0 * std::sqrt(655.36 * 0.99));  // binomial
  double mean = 0.0;
  for (const HotPixel& pixel : sensor.hot_pixels) mean += pixel.rate_e_per_s / hot;
  CHECK(std::abs(mean - 500.0) < 4.0 * 500.0 / std::sqrt(hot));  // an exponential's deviation is its mean
  const auto first = expose(sensor, 0, 0);
  for (const std::uint16_t code : first) {
    const bool is_above = code > 1000;
    if (!is_above) CHECK(code == 1000);
  }
  CHECK(std::count_if(first.begin(), first.end(), [](std::uint16_t code) { return code > 1000; }) <=
        static_cast<std::ptrdiff_t>(sensor.hot_pixels.size()));
  const HotPixel& brightest =
      *std::max_element(sensor.hot_pixels.begin(), sensor.hot_pixels.end(),
                        [](const HotPixel& a, const HotPixel& b) { return a.rate_e_per_s < b.rate_e_per_s; });
  const auto at = static_cast<std::size_t>(brightest.y * 256 + brightest.x);
  for (int frame = 0; frame < 4; ++frame)
    CHECK(std::abs(expose(sensor, 0, frame)[at] - 1000.0 - brightest.rate_e_per_s) <
          6.0 * std::sqrt(brightest.rate_e_per_s));
}

TEST_CASE("Response varies from pixel to pixel by the PRNU asked for, and stays from frame to frame") {
  Scene scene = even_scene(40000.0);
  scene.camera.prnu_percent = 2.0;
  const Sensor sensor = realize(scene);
  const auto first = expose(sensor, 0, 0), second = expose(sensor, 0, 1);
  const Moments frame = moments_of(first), noise = moments_of(difference(first, second));
  const double fixed = frame.variance - noise.variance / 2.0;  // what two frames share
  CHECK(std::abs(std::sqrt(fixed) / 40000.0 - 0.02) < 4.0 * 0.02 * variance_error(frame.count) / 2.0 * 1.1);
  CHECK(std::abs(noise.variance / 2.0 / 40000.0 - 1.0) < 4.0 * variance_error(frame.count));
}

TEST_CASE("Row noise is shared by a row, and new in every frame") {
  Scene scene = dark_scene(200, 400);
  scene.camera.row_noise_e = 5.0;
  const Sensor sensor = realize(scene);
  const auto first = expose(sensor, 0, 0), second = expose(sensor, 0, 1);
  std::vector<double> rows;
  for (std::size_t y = 0; y < 400; ++y) {
    const auto row = first.begin() + static_cast<std::ptrdiff_t>(y * 200);
    CHECK(std::count(row, row + 200, *row) == 200);
    rows.push_back(*row - static_cast<double>(second[y * 200]));
  }
  // Two independent rows, each rounded to whole DN.
  CHECK(std::abs(moments_of(rows).variance / (2.0 * (25.0 + 1.0 / 12.0)) - 1.0) <
        4.0 * variance_error(400.0));
}

TEST_CASE("Drift and jitter move whole frames by the amounts asked for") {
  Scene scene = even_scene(1000.0, 8, 8);
  scene.light.drift_percent = 1.5;
  scene.camera.offset_jitter_dn = 3.0;
  std::vector<double> scales, jitters;
  for (int frame = 0; frame < 2000; ++frame) {
    const FrameConditions own = frame_conditions(scene, 0, frame);
    scales.push_back(own.scale);
    jitters.push_back(own.jitter_dn);
  }
  const Moments scale = moments_of(scales), jitter = moments_of(jitters);
  CHECK(std::abs(scale.mean - 1.0) < 4.0 * 0.015 / std::sqrt(2000.0));
  CHECK(std::abs(scale.variance / (0.015 * 0.015) - 1.0) < 4.0 * variance_error(2000.0));
  CHECK(std::abs(jitter.variance / 9.0 - 1.0) < 4.0 * variance_error(2000.0));

  scene = even_scene(20000.0);
  scene.light.drift_percent = 5.0;
  const Moments frame = moments_of(expose(realize(scene), 0, 0));
  const double expected = 20000.0 * frame_conditions(scene, 0, 0).scale;
  CHECK(std::abs(frame.mean - 1000.0 - expected) < 4.0 * std::sqrt(expected / frame.count));
}

TEST_CASE("A trend runs from the first flat frame of the session to the last and leaves darks alone") {
  Scene scene = even_scene(100.0);
  scene.series.push_back(scene.series.front());
  scene.series.insert(scene.series.begin(), dark_scene().series.front());
  scene.light.trend_percent = 10.0;
  CHECK(frame_conditions(scene, 0, 0).scale == 1.0);
  CHECK(frame_conditions(scene, 1, 0).scale == 1.0);
  CHECK(frame_conditions(scene, 1, 1).scale == doctest::Approx(1.0 + 0.1 / 3.0));
  CHECK(frame_conditions(scene, 2, 1).scale == doctest::Approx(1.1));
}

TEST_CASE("Vignetting takes its share at the corners and nothing at the centre") {
  Scene scene = even_scene(10000.0, 65, 33);
  scene.light.vignetting = 0.4;
  const Sensor sensor = realize(scene);
  CHECK(sensor.illumination[16 * 65 + 32] == 1.0F);
  for (const std::size_t corner :
       {std::size_t{0}, std::size_t{64}, std::size_t{32 * 65}, std::size_t{33 * 65 - 1}})
    CHECK(sensor.illumination[corner] == doctest::Approx(0.6));
  CHECK(std::abs(expose(sensor, 0, 0)[0] - 7000.0) < 5.0 * std::sqrt(6000.0));
}

TEST_CASE("Codes end at the converter's ends, and charge at the full well") {
  Scene scene = even_scene(50000.0);
  scene.camera.bit_depth = 12;
  for (const std::uint16_t code : expose(realize(scene), 0, 0)) REQUIRE(code == 4095);
  scene.camera.full_well_e = 2000.0;
  for (const std::uint16_t code : expose(realize(scene), 0, 0)) REQUIRE(code == 3000);
  scene.camera.curvature = 0.1;  // a tenth of the signal is lost at full well
  for (const std::uint16_t code : expose(realize(scene), 0, 0)) REQUIRE(code == 2800);

  Scene dark = dark_scene();
  dark.camera.offset_dn = 0.0;
  dark.camera.read_noise_e = 10.0;
  const auto codes = expose(realize(dark), 0, 0);
  // Below 1/2 everything is 0: half of a normal distribution, and a little more.
  const double share = 0.5 * std::erfc(-0.05 / std::sqrt(2.0)), count = static_cast<double>(codes.size());
  const auto zeros = static_cast<double>(std::count(codes.begin(), codes.end(), std::uint16_t{0}));
  CHECK(std::abs(zeros / count - share) < 4.0 * std::sqrt(0.25 / count));
}

TEST_CASE("A half rounds up") {
  Scene scene = dark_scene();
  scene.camera.offset_dn = 100.5;
  CHECK(expose(realize(scene), 0, 0).front() == 101);
  scene.camera.offset_dn = 100.4999;
  CHECK(expose(realize(scene), 0, 0).front() == 100);
}

TEST_CASE("A left shift moves the same codes up") {
  Scene scene = even_scene(500.0);
  scene.camera.bit_depth = 12;
  scene.camera.read_noise_e = 2.0;
  const auto plain = expose(realize(scene), 0, 0);
  scene.camera.left_shift = 4;
  const auto shifted = expose(realize(scene), 0, 0);
  for (std::size_t i = 0; i < plain.size(); ++i) REQUIRE(shifted[i] == plain[i] * 16);
  scene.light.electrons_per_s = 1e5;
  CHECK(expose(realize(scene), 0, 0).front() == 65520);
}

TEST_CASE("Hits are as many as asked for, in darks too, and each adds its charge to its pixel") {
  Scene scene = dark_scene(200, 100);
  scene.hits = {6.0, 300.0};
  std::vector<double> counts, charges;
  for (int frame = 0; frame < 500; ++frame) {
    const FrameConditions own = frame_conditions(scene, 0, frame);
    counts.push_back(static_cast<double>(own.hits.size()));
    for (const Hit& hit : own.hits) charges.push_back(hit.charge_e);
  }
  const Moments count = moments_of(counts), charge = moments_of(charges);
  CHECK(std::abs(count.mean - 6.0) < 4.0 * std::sqrt(6.0 / 500.0));
  CHECK(std::abs(charge.mean - 300.0) < 4.0 * 300.0 / std::sqrt(charge.count));

  auto expected = std::vector<double>(200 * 100, 1000.0);
  const FrameConditions own = frame_conditions(scene, 0, 3);
  REQUIRE(!own.hits.empty());
  for (const Hit& hit : own.hits) expected[hit.pixel] += hit.charge_e;
  const auto codes = expose(realize(scene), 0, 3);
  for (std::size_t i = 0; i < codes.size(); ++i) REQUIRE(codes[i] == std::floor(expected[i] + 0.5));
}

TEST_CASE("Each amplifier has its own gain, offset and noise") {
  Scene scene = even_scene(1000.0, 200, 200);
  scene.amplifiers = {{"left", 0, 120, {}, {}, {}}, {"right", 120, 80, 300.0, 2.0, 5.0}};
  const auto codes = expose(realize(scene), 0, 0);
  std::vector<double> left, right;
  for (std::size_t i = 0; i < codes.size(); ++i) (i % 200 < 120 ? left : right).push_back(codes[i]);
  const Moments a = moments_of(left), b = moments_of(right);
  CHECK(std::abs(a.mean - 2000.0) < 4.0 * std::sqrt(1000.0 / a.count));
  CHECK(std::abs(b.mean - 2300.0) < 4.0 * 2.0 * std::sqrt(1025.0 / b.count));
  CHECK(std::abs(b.variance / (4.0 * 1025.0) - 1.0) < 4.0 * variance_error(b.count));
}

TEST_CASE("Another seed makes other frames of the same sensor, another camera seed another sensor") {
  Scene scene = even_scene(1000.0);
  scene.camera.prnu_percent = 1.0;
  const Sensor sensor = realize(scene);
  CHECK(expose(sensor, 0, 0) == expose(realize(scene), 0, 0));
  CHECK(expose(sensor, 0, 0) != expose(sensor, 0, 1));
  scene.seed = 2;
  const Sensor later = realize(scene);
  CHECK(later.response == sensor.response);
  CHECK(expose(later, 0, 0) != expose(sensor, 0, 0));
  scene.camera.seed = 2;
  CHECK(realize(scene).response != sensor.response);
}

}  // namespace
}  // namespace evenfield
