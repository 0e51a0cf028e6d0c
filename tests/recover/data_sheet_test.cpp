// The quantities that follow from others, on simulated cameras: as designed, or absent with the right reason.
#include <doctest/doctest.h>

#include <map>

#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

constexpr double kGain = 0.46;          // DN/e-
constexpr double kConverterTop = 8685;  // (4095 - 100) / 0.46 e-

Scene camera(std::uint64_t seed) {
  Scene scene;
  scene.seed = seed;
  scene.width = 160;
  scene.height = 128;
  scene.camera.seed = 1000 + seed;
  scene.camera.bit_depth = 12;
  scene.camera.offset_dn = 100;
  scene.camera.gain_dn_per_e = kGain;
  scene.camera.read_noise_e = 2.2;
  scene.camera.prnu_percent = 0.5;
  scene.camera.dsnu_e = 1;
  scene.light.electrons_per_s = 100000;
  scene.amplifiers.push_back({"whole", 0, 160, {}, {}, {}});
  add_series(scene, SeriesKind::bias, 0, 16);
  return scene;
}

void add_levels(Scene& scene, double first, double step, int count, int frames = 2) {
  for (int i = 0; i < count; ++i)
    add_series(scene, SeriesKind::flat, (first + step * i) / scene.light.electrons_per_s, frames);
}

bool says(const Quantity& q, const std::string& words) { return q.note.find(words) != std::string::npos; }

/// LE by the sums of METHODS 4 (1/y^2 weights), in long double, of levels within 5 to 95 % of `top`.
double linearity_error(const std::vector<std::pair<double, double>>& levels, double top) {
  long double s0 = 0, s1 = 0, s2 = 0, t0 = 0, t1 = 0;
  std::vector<std::pair<double, double>> used;
  for (const auto& [h, y] : levels) {
    if (y < 0.05 * top || y > 0.95 * top) continue;
    used.emplace_back(h, y);
    s0 += 1.0L / y / y;
    s1 += static_cast<long double>(h) / y / y;
    s2 += static_cast<long double>(h) * h / y / y;
    t0 += 1.0L / y;
    t1 += static_cast<long double>(h) / y;
  }
  const long double d = s0 * s2 - s1 * s1;
  const long double a1 = (s0 * t1 - s1 * t0) / d;
  const long double a0 = (s2 * t0 - s1 * t1) / d;
  long double sum = 0;
  for (const auto& [h, y] : used) sum += std::abs(100 * (y - a0 - a1 * h) / (a0 + a1 * h));
  return static_cast<double>(sum / static_cast<long double>(used.size()));
}

}  // namespace

TEST_CASE("a converter that ends before the charge: saturation has a value, full well says why it has none") {
  Scene scene = camera(1);
  add_levels(scene, 400, 400, 26);
  const Measurement m = measure_scene(scene);
  const Quantity& saturation = quantity(m.result, "saturation_capacity_e");
  REQUIRE(saturation.value);
  // 0.2 % of the pixels at the top code: 2.88 standard deviations of shot noise and 0.5 % PRNU below it.
  const double spread = std::hypot(std::sqrt(kConverterTop), 0.005 * kConverterTop);
  CHECK(*saturation.value == doctest::Approx(kConverterTop - 2.88 * spread).epsilon(0.01));
  const Quantity& well = quantity(m.result, "full_well_e");
  CHECK(!well.value);
  CHECK(says(well, "converter-limited"));
  const Quantity& linear = quantity(m.result, "linear_full_well_e");
  REQUIRE(linear.value);
  CHECK(*linear.value > *saturation.value);
  CHECK(*linear.value < 1.01 * kConverterTop);
  CHECK(*quantity(m.result, "linearity_error_percent").value < 0.1);
  const Quantity& range = quantity(m.result, "dynamic_range_ratio");
  REQUIRE(range.value);
  // Saturation over threshold, with sigma_y.dark of read noise and quantization.
  const double dark = std::sqrt(2.2 * 2.2 * kGain * kGain + 1.0 / 12) / kGain;
  CHECK(*range.value == doctest::Approx(*saturation.value / (dark + 0.5)).epsilon(0.02));
  CHECK(*quantity(m.result, "dynamic_range_db").value == doctest::Approx(20 * std::log10(*range.value)));
  CHECK(*quantity(m.result, "dynamic_range_bits").value == doctest::Approx(std::log2(*range.value)));
  CHECK(*quantity(m.result, "snr_max_ratio").value == doctest::Approx(std::sqrt(*saturation.value)));
  CHECK(*quantity(m.result, "absolute_threshold_e").value == doctest::Approx(dark + 0.5).epsilon(0.02));
  CHECK(says(quantity(m.result, "quantum_efficiency_percent"), "needs [light]"));
}

TEST_CASE(
    "light that falls off by 30 % leaves saturation capacity and linearity error where even light has them") {
  Scene even = camera(2);
  add_levels(even, 400, 400, 30, 4);
  Scene uneven = even;
  uneven.light.vignetting = 0.3;
  const Measurement a = measure_scene(even);
  const Measurement b = measure_scene(uneven);
  const auto value = [](const Measurement& m, const char* name) { return *quantity(m.result, name).value; };
  CHECK(value(b, "saturation_capacity_e") ==
        doctest::Approx(value(a, "saturation_capacity_e")).epsilon(0.01));
  CHECK(std::abs(value(b, "linearity_error_percent") - value(a, "linearity_error_percent")) < 0.05);
}

TEST_CASE("a session that never saturates gives lower limits and reasons") {
  Scene scene = camera(3);
  add_levels(scene, 400, 400, 12);
  const Measurement m = measure_scene(scene);
  for (const char* name :
       {"saturation_capacity_e", "full_well_e", "linear_full_well_e", "dynamic_range_ratio",
        "dynamic_range_db", "dynamic_range_bits", "snr_max_ratio", "snr_max_db"}) {
    CAPTURE(std::string(name));
    const Quantity& q = quantity(m.result, name);
    CHECK(!q.value);
    CHECK(q.low95);
    CHECK(says(q, "lower limit"));
  }
  // The brightest level has 4800 e-, which a tenth of a per cent of gain does not hide.
  CHECK(*quantity(m.result, "full_well_e").low95 == doctest::Approx(4800).epsilon(0.02));
  CHECK(*quantity(m.result, "snr_max_ratio").low95 == doctest::Approx(std::sqrt(4800.0)).epsilon(0.02));
}

TEST_CASE("charge that ends before the converter does is the full well") {
  Scene scene = camera(4);
  scene.camera.full_well_e = 6000;
  add_levels(scene, 300, 300, 28, 4);
  const Measurement m = measure_scene(scene);
  const Quantity& well = quantity(m.result, "full_well_e");
  REQUIRE_MESSAGE(well.value, well.note);
  CHECK(std::abs(*well.value - 6000) < 300);
  CHECK(std::abs(*well.value - 6000) < 3.5 * *well.standard_uncertainty);
  const Quantity& linear = quantity(m.result, "linear_full_well_e");
  REQUIRE_MESSAGE(linear.value, linear.note);
  CHECK(std::abs(*linear.value - 6000) < 150);
}

TEST_CASE("a response that bends by 3 % shows the linearity error and the linear full well of its formula") {
  Scene scene = camera(5);
  scene.camera.prnu_percent = 0.2;
  scene.camera.full_well_e = 12000;
  scene.camera.curvature = 0.03 * 12000 / kConverterTop;  // 3 % at the converter's top
  add_levels(scene, 300, 300, 34, 8);
  const Measurement m = measure_scene(scene);
  const Quantity& top = quantity(m.result, "saturation_dn");
  REQUIRE(top.value);
  std::vector<std::pair<double, double>> levels;
  for (int i = 0; i < 34; ++i) {
    const double charge = 300.0 + 300 * i;
    levels.emplace_back(charge, kGain * charge * (1 - 0.03 * charge / kConverterTop));
  }
  const Quantity& error = quantity(m.result, "linearity_error_percent");
  REQUIRE(error.value);
  CHECK(*error.value == doctest::Approx(linearity_error(levels, *top.value)).epsilon(0.05));
  // The bend moves the line, too: the deviation leaves 1 % near the top.
  const Quantity& linear = quantity(m.result, "linear_full_well_e");
  CHECK((linear.value || linear.low95));
}

TEST_CASE("a camera that holds its dark level has its dark current from variances, and says so") {
  Scene scene = camera(6);
  scene.camera.dark_current_e_per_s = 400;
  for (const double exposure : {0.2, 0.5, 1.0}) add_series(scene, SeriesKind::dark, exposure, 8);
  add_levels(scene, 500, 500, 12, 4);
  Measurement m = measure_scene(scene);
  CHECK(quantity(m.result, "dark_current_e_per_s").value);
  // The same frames with the darks' means held, as a regulation in the camera does.
  const Measurement held = measure_scene(scene, 2, [](Conditions conditions, std::uint16_t code) {
    const double grown = conditions.kind == SeriesKind::dark ? kGain * 400 * *conditions.exposure_s : 0.0;
    return static_cast<std::uint16_t>(std::lround(code - std::floor(grown)));
  });
  const Quantity& means = quantity(held.result, "dark_current_e_per_s");
  CHECK(!means.value);
  CHECK(says(means, "holds its dark level"));
  const Quantity& variances = quantity(held.result, "dark_current_from_variance_e_per_s");
  REQUIRE(variances.value);
  CHECK(std::abs(*variances.value - 400) < 4 * *variances.standard_uncertainty);
  CHECK(std::any_of(held.result.findings.begin(), held.result.findings.end(),
                    [](const Finding& f) { return f.code == "offset-regulated"; }));
}

TEST_CASE(
    "a filter that smooths neighbours is found, and the lag-summed gain is right where the line is not") {
  Scene scene = camera(7);
  scene.camera.prnu_percent = 0.2;
  add_levels(scene, 500, 500, 11, 8);
  // Each pixel keeps 90 % of itself and takes 10 % of its left neighbour's code: variance falls to 0.82, and
  // the covariance with each neighbour of the row is 0.09 of what it was, so that the sum is 1 again.
  const Measurement m = measure_scene(scene, 2, {}, [](const std::vector<std::uint16_t>& frame, int width) {
    std::vector<std::uint16_t> out = frame;
    for (std::size_t i = 0; i < frame.size(); ++i)
      if (i % static_cast<std::size_t>(width) != 0)
        out[i] = static_cast<std::uint16_t>(std::lround(0.9 * frame[i] + 0.1 * frame[i - 1]));
    return out;
  });
  const Quantity& line = quantity(m.result, "conversion_gain_line_dn_per_e");
  const Quantity& lags = quantity(m.result, "conversion_gain_lag_summed_dn_per_e");
  REQUIRE(line.value);
  REQUIRE(lags.value);
  CHECK(*line.value == doctest::Approx(0.82 * kGain).epsilon(0.01));
  CHECK(std::abs(*lags.value - kGain) < 4 * *lags.standard_uncertainty);
  CHECK(*lags.standard_uncertainty < 0.03 * kGain);
  CHECK(std::any_of(m.result.findings.begin(), m.result.findings.end(), [](const Finding& f) {
    return f.code == "correlated-noise" && f.severity == Severity::caution;
  }));
}

TEST_CASE("sharing along both axes and one diagonal leaves the lag-summed gain in place") {
  Scene scene = camera(8);
  scene.width = 256;
  scene.height = 256;
  scene.amplifiers.front().width = 256;
  scene.camera.prnu_percent = 0.2;
  add_levels(scene, 500, 500, 11, 8);
  // 70 % of itself and 10 % of the pixels to the left, above, and above to the left: the sum of all
  // covariances is 1.
  const Measurement m = measure_scene(scene, 2, {}, [](const std::vector<std::uint16_t>& frame, int width) {
    std::vector<std::uint16_t> out = frame;
    const auto w = static_cast<std::size_t>(width);
    for (std::size_t i = w + 1; i < frame.size(); ++i)
      if (i % w != 0)
        out[i] = static_cast<std::uint16_t>(
            std::lround(0.7 * frame[i] + 0.1 * (frame[i - 1] + frame[i - w] + frame[i - w - 1])));
    return out;
  });
  const Quantity& lags = quantity(m.result, "conversion_gain_lag_summed_dn_per_e");
  REQUIRE(lags.value);
  CHECK(std::abs(*lags.value - kGain) < 4 * *lags.standard_uncertainty);
  CHECK(*lags.standard_uncertainty < 0.02 * kGain);
  CHECK(*quantity(m.result, "conversion_gain_line_dn_per_e").value < 0.6 * kGain);
}

TEST_CASE(
    "an offset that jitters is no flicker of the light, and its interval holds the truth with few frames") {
  Pulls jitter;
  int flickers = 0;
  constexpr int kCameras = 60;
  for (std::uint64_t seed = 0; seed < kCameras; ++seed) {
    Scene scene = camera(300 + seed);
    scene.series.clear();
    add_series(scene, SeriesKind::bias, 0, 4);
    scene.camera.offset_jitter_dn = 1.0;
    for (const double e : {120, 1000, 2500, 4000, 5500})
      add_series(scene, SeriesKind::flat, e / scene.light.electrons_per_s, 4);
    const Measurement m = measure_scene(scene);
    const Quantity& q = quantity(m.result, "offset_jitter_dn");
    if (q.value) jitter.add(q, 1.0);
    for (const Finding& f : m.result.findings) flickers += f.code == "light-drift" ? 1 : 0;
  }
  CHECK(jitter.values.size() >= kCameras - 2);
  // 95 % of them, less four standard deviations of a binomial share.
  const double n = static_cast<double>(jitter.values.size());
  CHECK(jitter.inside > 0.95 * n - 4 * std::sqrt(0.95 * 0.05 * n));
  CHECK(flickers == 0);
}

TEST_CASE("pulls of what follows from others have mean 0 and spread 1") {
  std::map<std::string, Pulls> pulls;
  constexpr int kCameras = 60;
  for (std::uint64_t seed = 0; seed < kCameras; ++seed) {
    Scene scene = camera(100 + seed);
    scene.camera.row_noise_e = 1.5;
    scene.camera.offset_jitter_dn = 0.3;
    scene.camera.dark_current_e_per_s = 200;
    scene.camera.pixel_pitch_um = 6.5;
    scene.camera.quantum_efficiency = 0.7;
    scene.light.wavelength_nm = 530;
    add_series(scene, SeriesKind::dark, 0.2, 8);
    add_series(scene, SeriesKind::dark, 0.5, 8);
    for (const double e : {400, 1000, 1600, 2200, 2800, 3400, 4000, 4600, 5200, 5800, 9800})
      add_series(scene, SeriesKind::flat, e / scene.light.electrons_per_s, 4);
    const Measurement m = measure_scene(scene);
    const RegionTruth& t = m.truth[0];
    const auto add = [&](const char* name, double truth) {
      pulls[name].add(quantity(m.result, name), truth);
    };
    add("conversion_gain_line_dn_per_e", t.conversion_gain_dn_per_e);
    add("conversion_gain_curved_dn_per_e", t.conversion_gain_dn_per_e);
    add("variance_curvature_per_e", 0);
    add("conversion_gain_lag_summed_dn_per_e", t.conversion_gain_dn_per_e);
    add("row_noise_e", 1.5);
    add("offset_jitter_dn", 0.3);
    add("dark_current_from_variance_e_per_s", 200);
    add("shutter_offset_s", 0);
  }
  for (const auto& [name, p] : pulls) {
    INFO(name);
    INFO("mean ", p.mean(), " spread ", p.spread(), " inside ", p.inside, " of ", p.values.size(),
         ", missing ", p.missing);
    const double n = static_cast<double>(p.values.size());
    CHECK(p.missing == 0);
    // Four standard errors each, as in recover_test.cpp; a root of a difference is skewed, which takes a
    // little more.
    CHECK(std::abs(p.mean()) < 4 / std::sqrt(n));
    CHECK(p.spread() < 1.1 * (1 + 4 / std::sqrt(2 * n)));
    CHECK(p.spread() > 0.9 * (1 - 4 / std::sqrt(2 * n)));
    CHECK(p.inside > 0.95 * n - 4 * std::sqrt(0.95 * 0.05 * n));
  }
}
