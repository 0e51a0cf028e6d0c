// Simulated cameras over many seeds: does the program find the truth, within the uncertainty it states?
#include <doctest/doctest.h>

#include <map>

#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

/// 12-bit camera of 0.46 DN/e- and 2.2 e-, PRNU 1 %, DSNU 1 e-; 160 x 128 pixels.
Scene small_camera(std::uint64_t seed) {
  Scene scene;
  scene.seed = seed;
  scene.width = 160;
  scene.height = 128;
  scene.camera.seed = 1000 + seed;
  scene.camera.bit_depth = 12;
  scene.camera.offset_dn = 100;
  scene.camera.gain_dn_per_e = 0.46;
  scene.camera.read_noise_e = 2.2;
  scene.camera.prnu_percent = 1;
  scene.camera.dsnu_e = 1;
  scene.light.electrons_per_s = 100000;
  scene.amplifiers.push_back({"whole", 0, 160, {}, {}, {}});
  return scene;
}

/// Levels at these signals [e-].
void add_levels(Scene& scene, const std::vector<double>& electrons, int frames) {
  for (const double e : electrons)
    add_series(scene, SeriesKind::flat, e / scene.light.electrons_per_s, frames);
}

std::vector<double> steps(double first, double step, int count) {
  std::vector<double> out;
  for (int i = 0; i < count; ++i) out.push_back(first + step * i);
  return out;
}

/// Bounds that a right program misses less than once in 10 000 runs: the spread of n pulls has the relative
/// standard deviation 1/sqrt(2n), their mean 1/sqrt(n); 4 of them each, and the share inside 0.95 likewise
/// (binomial).
void check_pulls(const std::string& name,
                 const Pulls& pulls,
                 double spread_low = 1.0,
                 double spread_high = 1.0) {
  INFO(name);
  CHECK(pulls.missing == 0);
  const double n = static_cast<double>(pulls.values.size());
  INFO("mean ", pulls.mean(), " spread ", pulls.spread(), " inside ", pulls.inside, " of ", n);
  CHECK(std::abs(pulls.mean()) < 4 / std::sqrt(n));
  CHECK(pulls.spread() < spread_high * (1 + 4 / std::sqrt(2 * n)));
  CHECK(pulls.spread() > spread_low * (1 - 4 / std::sqrt(2 * n)));
  CHECK(pulls.inside > 0.95 * n - 4 * std::sqrt(0.95 * 0.05 * n));
}

}  // namespace

TEST_CASE(
    "thirty levels of two frames and sixteen bias frames: gain and read noise as sharp as they can be") {
  for (const std::uint64_t seed : {1, 2, 3}) {
    Scene scene = small_camera(seed);
    add_series(scene, SeriesKind::bias, 0, 16);
    // 29 levels below 70 % of the range (8685 e-) and one past saturation. The bound of Cramer and Rao is
    // then sqrt(2 / (20480 x 29)) = 0.184 % for the gain and 0.23 % for the read noise.
    add_levels(scene, steps(200, 200, 29), 2);
    add_levels(scene, {9800}, 2);
    const Measurement m = measure_scene(scene);
    const Quantity& gain = quantity(m.result, "conversion_gain_dn_per_e");
    const Quantity& noise = quantity(m.result, "read_noise_e");
    REQUIRE(gain.value);
    REQUIRE(noise.value);
    INFO(*gain.value, " +- ", *gain.standard_uncertainty, "; ", *noise.value, " +- ",
         *noise.standard_uncertainty);
    CHECK(std::abs(*gain.value - m.truth[0].conversion_gain_dn_per_e) < 3.5 * *gain.standard_uncertainty);
    CHECK(std::abs(*noise.value - m.truth[0].read_noise_e) < 3.5 * *noise.standard_uncertainty);
    CHECK(*gain.standard_uncertainty / *gain.value < 0.0020);
    CHECK(*noise.standard_uncertainty / *noise.value < 0.0026);
    CHECK(quantity(m.result, "conversion_gain_e_per_dn").value ==
          doctest::Approx(1 / *gain.value).epsilon(1e-12));
    for (const Finding& finding : m.result.findings)
      CHECK_MESSAGE(finding.severity == Severity::info, finding.code, ": ", finding.message);
  }
}

TEST_CASE("pulls of every quantity have mean 0 and spread 1 and intervals hold the truth") {
  std::map<std::string, Pulls> pulls;
  for (std::uint64_t seed = 0; seed < 120; ++seed) {
    Scene scene = small_camera(seed);
    scene.width = 96;
    scene.height = 96;
    scene.amplifiers.front().width = 96;
    scene.camera.offset_jitter_dn = 0.05;
    scene.camera.dark_current_e_per_s = 20;
    scene.light.drift_percent = 0.3;
    add_series(scene, SeriesKind::bias, 0, 8);
    add_series(scene, SeriesKind::dark, 0.5, 8);
    add_series(scene, SeriesKind::dark, 1.0, 8);
    add_levels(scene, {400, 1500, 3000, 4300, 5500, 9800}, 4);
    const Measurement m = measure_scene(scene);
    const RegionTruth& t = m.truth[0];
    const auto add = [&](const char* name, double truth) {
      pulls[name].add(quantity(m.result, name), truth);
    };
    add("conversion_gain_dn_per_e", t.conversion_gain_dn_per_e);
    add("conversion_gain_e_per_dn", 1 / t.conversion_gain_dn_per_e);
    add("conversion_gain_origin_line_dn_per_e", t.conversion_gain_dn_per_e);
    add("read_noise_dn", t.read_noise_dn);
    add("read_noise_e", t.read_noise_e);
    add("dark_offset_dn", t.dark_offset_dn);
    add("dsnu_e", t.dsnu_e);
    add("prnu_percent", t.prnu_with_vignetting_percent);
    add("dark_current_e_per_s", t.dark_current_e_per_s);
  }
  for (const auto& [name, p] : pulls) check_pulls(name, p);
}

TEST_CASE("two per cent lamp drift over strong vignetting with hits leaves gain and read noise in place") {
  Pulls gain;
  Pulls noise;
  double bias = 0;
  constexpr int kCameras = 24;
  for (std::uint64_t seed = 0; seed < kCameras; ++seed) {
    Scene scene = small_camera(100 + seed);
    scene.light.vignetting = 0.8;
    scene.light.drift_percent = 2;
    scene.hits.per_frame = 2;  // 400 in a frame of 2048 x 2048 pixels; more would meet in one pixel
    scene.hits.mean_e = 1500;
    add_series(scene, SeriesKind::bias, 0, 16);
    add_levels(scene, {500, 1500, 2500, 3500, 4500, 5500, 9500}, 8);
    const Measurement m = measure_scene(scene);
    gain.add(quantity(m.result, "conversion_gain_dn_per_e"), m.truth[0].conversion_gain_dn_per_e);
    noise.add(quantity(m.result, "read_noise_e"), m.truth[0].read_noise_e);
    bias += *quantity(m.result, "conversion_gain_dn_per_e").value / m.truth[0].conversion_gain_dn_per_e /
                kCameras -
            1.0 / kCameras;
  }
  INFO("mean relative deviation of the gain ", bias);
  CHECK(std::abs(bias) < 0.002);
  check_pulls("conversion_gain_dn_per_e", gain);
  check_pulls("read_noise_e", noise);
}

TEST_CASE("one light level gives a two-point gain and says what is lost") {
  Scene scene = small_camera(5);
  add_series(scene, SeriesKind::bias, 0, 16);
  add_levels(scene, {4000}, 8);
  const Measurement m = measure_scene(scene);
  const Quantity& gain = quantity(m.result, "conversion_gain_dn_per_e");
  REQUIRE(gain.value);
  CHECK(std::abs(*gain.value - 0.46) < 4 * *gain.standard_uncertainty);
  CHECK(gain.note.find("two points") != std::string::npos);
  CHECK(!quantity(m.result, "linearity_error_percent").value);
  CHECK(quantity(m.result, "linearity_error_percent").note.find("three levels") != std::string::npos);
  CHECK(!quantity(m.result, "saturation_capacity_e").value);
  CHECK(quantity(m.result, "saturation_capacity_e").low95 == doctest::Approx(4000).epsilon(0.05));
  CHECK(std::any_of(m.result.findings.begin(), m.result.findings.end(), [](const Finding& f) {
    return f.code == "too-few-levels" && f.severity == Severity::caution;
  }));
}

TEST_CASE("row noise that all pixels of a row share widens the uncertainty as it should") {
  Pulls noise;
  for (std::uint64_t seed = 0; seed < 60; ++seed) {
    Scene scene = small_camera(200 + seed);
    scene.camera.row_noise_e = 1.5;
    add_series(scene, SeriesKind::bias, 0, 8);
    add_levels(scene, {500, 2000, 4000, 5500, 9800}, 2);
    const Measurement m = measure_scene(scene);
    noise.add(quantity(m.result, "read_noise_e"), m.truth[0].read_noise_e);
  }
  check_pulls("read_noise_e", noise, 0.9, 1.1);  // sixteen bands: the uncertainty itself scatters by 18 %
}

TEST_CASE("two amplifiers are told apart, and saturation is found per block under uneven light") {
  Scene scene = small_camera(9);
  scene.amplifiers = {{"left", 0, 80, 90.0, 0.42, 2.0}, {"right", 80, 80, 140.0, 0.50, 3.1}};
  scene.amplifiers_listed = true;
  scene.light.vignetting = 0.3;
  add_series(scene, SeriesKind::bias, 0, 16);
  add_levels(scene, steps(800, 800, 16), 4);
  const Measurement m = measure_scene(scene);
  for (const RegionTruth& t : m.truth) {
    const Quantity& gain = quantity(m.result, "conversion_gain_dn_per_e", t.name);
    const Quantity& noise = quantity(m.result, "read_noise_e", t.name);
    const Quantity& well = quantity(m.result, "saturation_capacity_e", t.name);
    REQUIRE(gain.value);
    CHECK(std::abs(*gain.value - t.conversion_gain_dn_per_e) < 4 * *gain.standard_uncertainty);
    CHECK(std::abs(*noise.value - t.read_noise_e) < 4 * *noise.standard_uncertainty);
    REQUIRE(well.value);
    // 0.2 % of the pixels are at the top code 2.9 standard deviations below the level where the mean pixel
    // would be.
    const double electrons =
        t.saturation_capacity_e -
        2.878 * std::sqrt(t.saturation_capacity_e * (1 + 0.0001 * t.saturation_capacity_e));
    INFO(t.name, " ", *well.value, " expected ", electrons);
    CHECK(*well.value == doctest::Approx(electrons).epsilon(0.01));
  }
}
