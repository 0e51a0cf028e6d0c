#include "analyse/levels.h"

#include <doctest/doctest.h>

#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

Scene camera() {
  Scene scene;
  scene.seed = 3;
  scene.width = 128;
  scene.height = 128;
  scene.camera.bit_depth = 12;
  scene.camera.offset_dn = 100;
  scene.camera.gain_dn_per_e = 0.5;
  scene.camera.read_noise_e = 3;
  scene.light.electrons_per_s = 10000;
  scene.amplifiers.push_back({"whole", 0, 128, {}, {}, {}});
  return scene;
}

bool has(const Characterization& result, const char* code, Severity severity) {
  return std::any_of(result.findings.begin(), result.findings.end(),
                     [&](const Finding& f) { return f.code == code && f.severity == severity; });
}

}  // namespace

TEST_CASE("codes in the high bits keep their step, and saturation is at the highest of them") {
  Scene scene = camera();
  scene.camera.left_shift = 4;
  add_series(scene, SeriesKind::bias, 0, 8);
  for (const double t : {0.05, 0.1, 0.2, 0.4, 0.6, 1.2}) add_series(scene, SeriesKind::flat, t, 4);
  const Measurement m = measure_scene(scene);
  const Quantity& gain = quantity(m.result, "conversion_gain_dn_per_e");
  REQUIRE(gain.value);
  CHECK(std::abs(*gain.value - 16 * 0.5) < 4 * *gain.standard_uncertainty);
  const Quantity& noise = quantity(m.result, "read_noise_e");
  CHECK(std::abs(*noise.value - 3.0) < 4 * *noise.standard_uncertainty);
  // 0.2 % of the pixels at 4095: 2.878 standard deviations below it; variance there 0.5 x 3900 + 2.25 DN^2.
  const double sigma = std::sqrt(0.5 * 3870 + 2.25);
  CHECK(*quantity(m.result, "saturation_dn").value ==
        doctest::Approx(16 * (4094.5 - 100 - 2.878 * sigma)).epsilon(0.002));
  CHECK(has(m.result, "saturated", Severity::info));
}

TEST_CASE("a session that never saturates gives a lower limit in place of saturation") {
  Scene scene = camera();
  add_series(scene, SeriesKind::bias, 0, 8);
  for (const double t : {0.05, 0.1, 0.2, 0.3, 0.4}) add_series(scene, SeriesKind::flat, t, 4);
  const Measurement m = measure_scene(scene);
  const Quantity& well = quantity(m.result, "saturation_capacity_e");
  CHECK(!well.value);
  // The signal that was reached, less what the gain's own uncertainty allows.
  CHECK(*well.low95 < 4000);
  CHECK(*well.low95 > 3850);
  CHECK(quantity(m.result, "linearity_error_percent").value);
}

TEST_CASE(
    "copies of frames, darks without noise and missing exposures are findings or reasons, never silence") {
  Scene scene = camera();
  add_series(scene, SeriesKind::bias, 0, 4);
  add_series(scene, SeriesKind::flat, 0.1, 4);
  const Sensor sensor = realize(scene);
  AnalysisInput input;
  input.bit_depth = 12;
  input.regions.push_back({"whole", {0, 0, 128, 128}});
  const Geometry geometry = make_geometry({128, 128, PixelType::u16}, {{0, 0, 128, 128}});
  const auto add = [&](SeriesKind kind, std::vector<std::vector<std::uint16_t>> frames,
                       std::optional<double> dark) {
    const RawFrames<std::uint16_t> raw(128, 128, std::move(frames));
    const auto sums = accumulate(raw.stack(), geometry, {});
    SeriesInput series;
    series.conditions.kind = kind;
    if (kind != SeriesKind::flat) series.conditions.exposure_s = 0.0;
    series.regions.push_back(summarize(sums->regions[0], dark));
    series.fingerprints = sums->fingerprints;
    series.code_sample = sums->code_sample;
    input.series.push_back(series);
  };
  const auto flat = expose(sensor, 1, 0);
  add(SeriesKind::bias, std::vector(3, std::vector<std::uint16_t>(128 * 128, 100)), {});
  add(SeriesKind::flat, {flat, flat, expose(sensor, 1, 1)}, 100.0);
  const Characterization result = analyse(input);
  CHECK(has(result, "zero-noise", Severity::problem));
  CHECK(has(result, "duplicate-frames", Severity::problem));
  CHECK(!quantity(result, "read_noise_dn").value);
  CHECK(quantity(result, "read_noise_dn").note.find("no noise at all") != std::string::npos);
  CHECK(!quantity(result, "linearity_error_percent").value);
}

TEST_CASE("levels of one frame each still give a linearity error, with an uncertainty that is not zero") {
  Scene scene = camera();
  add_series(scene, SeriesKind::bias, 0, 1);
  for (const double t : {0.05, 0.1, 0.2, 0.3, 0.4, 0.5}) add_series(scene, SeriesKind::flat, t, 1);
  const Measurement m = measure_scene(scene);
  const Quantity& error = quantity(m.result, "linearity_error_percent");
  REQUIRE(error.value);
  CHECK(*error.standard_uncertainty > 0);
  CHECK(*error.value < 0.2);
  CHECK(!quantity(m.result, "conversion_gain_dn_per_e").value);
  CHECK(!quantity(m.result, "dsnu_dn").value);
  for (const SeriesResult& s : m.result.series) CHECK(s.mean_uncertainty_dn > 0);
  CHECK(has(m.result, "too-few-frames", Severity::problem));
}
