// Sessions with one fault each: the number that would be wrong is absent or flagged, and nothing else is.
#include <doctest/doctest.h>

#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

Scene camera(std::uint64_t seed) {
  Scene scene;
  scene.seed = seed;
  scene.width = 128;
  scene.height = 128;
  scene.camera.seed = seed;
  scene.camera.bit_depth = 12;
  scene.camera.offset_dn = 100;
  scene.camera.gain_dn_per_e = 0.5;
  scene.camera.read_noise_e = 3;
  scene.light.electrons_per_s = 10000;
  scene.amplifiers.push_back({"whole", 0, 128, {}, {}, {}});
  return scene;
}

void usual_series(Scene& scene, int flat_frames = 4) {
  add_series(scene, SeriesKind::bias, 0, 8);
  for (const double t : {0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 1.0})
    add_series(scene, SeriesKind::flat, t, flat_frames);
}

const Finding* finding(Characterization&&, const std::string&) = delete;  // it would dangle
const Finding* finding(const Characterization& result, const std::string& code) {
  const auto found = std::find_if(result.findings.begin(), result.findings.end(),
                                  [&](const Finding& f) { return f.code == code; });
  return found == result.findings.end() ? nullptr : &*found;
}

/// Frames of a scene measured after `change` has had its way with each.
Characterization measure_changed(const Scene& scene,
                                 const std::function<void(SeriesKind, std::vector<std::uint16_t>&)>& change) {
  const Sensor sensor = realize(scene);
  AnalysisInput input;
  input.bit_depth = scene.camera.bit_depth;
  const Rect whole{0, 0, scene.width, scene.height};
  input.regions.push_back({"whole", whole});
  const Geometry geometry = make_geometry({scene.width, scene.height, PixelType::u16}, {whole});
  for (std::size_t s = 0; s < scene.series.size(); ++s) {  // darks come first in these scenes
    std::vector<std::vector<std::uint16_t>> frames;
    for (int f = 0; f < scene.series[s].frames; ++f) {
      frames.push_back(expose(sensor, static_cast<int>(s), f));
      change(scene.series[s].conditions.kind, frames.back());
    }
    const RawFrames<std::uint16_t> raw(scene.width, scene.height, std::move(frames));
    const auto sums = accumulate(raw.stack(), geometry, {});
    SeriesInput series;
    series.conditions = scene.series[s].conditions;
    std::optional<double> dark;
    if (series.conditions.kind == SeriesKind::flat) dark = input.series.front().regions[0].mean;
    series.regions.push_back(summarize(sums->regions[0], dark));
    series.fingerprints = sums->fingerprints;
    series.code_sample = sums->code_sample;
    input.series.push_back(series);
  }
  return analyse(input);
}

}  // namespace

TEST_CASE("frames saturated but for a dead pixel are alike without being called copies") {
  Scene scene = camera(1);
  usual_series(scene);
  const auto result =
      measure_changed(scene, [](SeriesKind, std::vector<std::uint16_t>& frame) { frame[645] = 0; });
  CHECK(finding(result, "duplicate-frames") == nullptr);
  for (const Finding& f : result.findings) CHECK_MESSAGE(f.severity == Severity::info, f.code);
}

TEST_CASE("darks cut off at code zero are a problem that names read noise") {
  Scene scene = camera(2);
  scene.camera.offset_dn = 0;
  usual_series(scene);
  const Measurement m = measure_scene(scene);
  const Finding* clipped = finding(m.result, "clipped-dark");
  REQUIRE(clipped);
  CHECK(clipped->severity == Severity::problem);
  CHECK(std::count(clipped->quantities.begin(), clipped->quantities.end(), "read_noise_e") == 1);
  Scene clear = camera(2);
  clear.camera.offset_dn = 12;  // eight standard deviations
  usual_series(clear);
  const Measurement clean = measure_scene(clear);
  CHECK(finding(clean.result, "clipped-dark") == nullptr);
}

TEST_CASE("a session of saturated flats alone has no saturation but an upper limit") {
  Scene scene = camera(3);
  add_series(scene, SeriesKind::bias, 0, 8);
  for (const double t : {2.0, 3.0, 4.0}) add_series(scene, SeriesKind::flat, t, 2);
  const Measurement m = measure_scene(scene);
  CHECK(!quantity(m.result, "saturation_dn").value);
  CHECK(quantity(m.result, "saturation_dn").high95 == doctest::Approx(3995).epsilon(0.001));
  CHECK(quantity(m.result, "saturation_dn").note.find("every level is saturated") != std::string::npos);
  CHECK(!quantity(m.result, "conversion_gain_dn_per_e").value);
}

TEST_CASE("flats darker than their darks are called a light leak") {
  Scene scene = camera(4);
  usual_series(scene);
  const auto result = measure_changed(scene, [](SeriesKind kind, std::vector<std::uint16_t>& frame) {
    if (kind != SeriesKind::flat)
      for (std::uint16_t& pixel : frame) pixel = static_cast<std::uint16_t>(pixel + 400);
  });
  const Finding* leak = finding(result, "light-leak");
  REQUIRE(leak);
  CHECK(leak->severity == Severity::problem);
  CHECK(leak->message.find("darker than the matching darks") != std::string::npos);
}

TEST_CASE("a mean-variance relation that is not straight is said so") {
  Scene scene = camera(5);
  scene.camera.full_well_e = 7500;
  scene.camera.curvature = 0.25;
  usual_series(scene, 8);
  const Measurement m = measure_scene(scene);
  REQUIRE(finding(m.result, "nonlinear"));
  CHECK(finding(m.result, "nonlinear")->severity == Severity::caution);
}

TEST_CASE("pixels stuck at the top in darks and flats do not pass for saturation") {
  Scene scene = camera(6);
  usual_series(scene);
  const auto result = measure_changed(scene, [](SeriesKind, std::vector<std::uint16_t>& frame) {
    for (std::size_t p = 7; p < frame.size(); p += 100) frame[p] = 4095;
  });
  REQUIRE(quantity(result, "conversion_gain_dn_per_e").value);
  CHECK(*quantity(result, "conversion_gain_dn_per_e").value == doctest::Approx(0.5).epsilon(0.03));
  REQUIRE(quantity(result, "saturation_dn").value);
  CHECK(quantity(result, "linearity_error_percent").value);
  CHECK(finding(result, "saturated")->series.size() == 1);
}

TEST_CASE("an ideally straight response has a linearity error whose interval reaches zero") {
  int reaches = 0;
  for (std::uint64_t seed = 0; seed < 12; ++seed) {
    Scene scene = camera(20 + seed);
    scene.light.drift_percent = seed % 2 == 0 ? 0.0 : 1.0;
    usual_series(scene);
    const Measurement m = measure_scene(scene);
    const Quantity& error = quantity(m.result, "linearity_error_percent");
    REQUIRE(error.value);
    if (*error.low95 == 0) ++reaches;
  }
  CHECK(reaches >= 10);
}

TEST_CASE("a pattern that is not resolved has an upper limit above zero") {
  for (std::uint64_t seed = 0; seed < 8; ++seed) {
    Scene scene = camera(40 + seed);
    usual_series(scene);
    const Measurement m = measure_scene(scene);
    const Quantity& pattern = quantity(m.result, "dsnu_dn");
    REQUIRE(pattern.high95);
    CHECK(*pattern.high95 > 0.005);
    if (pattern.value) CHECK(*pattern.standard_uncertainty < 0.1);
  }
}

TEST_CASE("row noise neither passes for flicker of the lamp nor makes DSNU look sharper than it is") {
  Pulls pattern;
  for (std::uint64_t seed = 0; seed < 40; ++seed) {
    Scene scene = camera(60 + seed);
    scene.camera.row_noise_e = 4;
    scene.camera.dsnu_e = 2;
    add_series(scene, SeriesKind::bias, 0, 16);
    add_series(scene, SeriesKind::flat, 0.02, 8);
    add_series(scene, SeriesKind::flat, 0.3, 8);
    const Measurement m = measure_scene(scene);
    pattern.add(quantity(m.result, "dsnu_e"), m.truth[0].dsnu_e);
    CHECK(finding(m.result, "light-drift") == nullptr);
  }
  INFO("mean ", pattern.mean(), " spread ", pattern.spread());
  CHECK(pattern.spread() < 1 + 4 / std::sqrt(80.0));
  CHECK(std::abs(pattern.mean()) < 4 / std::sqrt(40.0));
}

TEST_CASE("every absent value says why") {
  Scene constant = camera(90);
  constant.camera.read_noise_e = 0;
  add_series(constant, SeriesKind::bias, 0, 4);
  add_series(constant, SeriesKind::flat, 0.1, 4);
  add_series(constant, SeriesKind::flat, 0.2, 4);
  const auto result = measure_changed(constant, [](SeriesKind kind, std::vector<std::uint16_t>& frame) {
    std::fill(frame.begin(), frame.end(), kind == SeriesKind::flat ? 2000 : 100);
  });
  for (const Quantity& q : result.quantities)
    if (!q.value) CHECK_MESSAGE((q.note.size() > 10 && !q.note.ends_with(": ")), q.name, ": ", q.note);
  CHECK(!quantity(result, "conversion_gain_dn_per_e").value);
}
