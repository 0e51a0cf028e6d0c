// Clean sessions of random cameras: findings that call for action would be false alarms.
#include <doctest/doctest.h>

#include <boost/random/mersenne_twister.hpp>
#include <boost/random/uniform_real_distribution.hpp>

#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

TEST_CASE("clean sessions of random cameras raise nothing above info, and their numbers are right") {
  boost::random::mt19937_64 random(77);
  const auto uniform = [&](double low, double high) {
    return boost::random::uniform_real_distribution<double>(low, high)(random);
  };
  Pulls gain;
  Pulls noise;
  for (int k = 0; k < 60; ++k) {
    Scene scene;
    scene.seed = static_cast<std::uint64_t>(k);
    scene.width = 96;
    scene.height = 96;
    scene.camera.seed = 500 + static_cast<std::uint64_t>(k);
    scene.camera.bit_depth = 12 + 2 * (k % 3);
    const double top = std::ldexp(1.0, scene.camera.bit_depth);
    // From a tenth to twice the noise of the converter's step, and a well of 5 000 to 60 000 electrons.
    const double well = uniform(5000, 60000);
    scene.camera.gain_dn_per_e = 0.93 * top / well;
    scene.camera.read_noise_e = uniform(1.2, 4.0) / std::min(1.0, scene.camera.gain_dn_per_e);
    scene.camera.offset_dn = 20 + 8 * scene.camera.read_noise_e * scene.camera.gain_dn_per_e;
    scene.camera.prnu_percent = uniform(0.2, 1.5);
    scene.camera.dsnu_e = uniform(0, 2);
    scene.camera.dark_current_e_per_s = uniform(0, 20);
    scene.light.electrons_per_s = well;  // full after a second
    scene.light.vignetting = uniform(0, 0.3);
    scene.light.drift_percent = uniform(0, 0.4);
    scene.amplifiers.push_back({"whole", 0, 96, {}, {}, {}});
    const int frames = 2 + k % 7;
    // A short dark serves as a bias: 0.002 e- of dark current are not to be seen in it.
    add_series(scene, k % 2 == 0 ? SeriesKind::bias : SeriesKind::dark, k % 2 == 0 ? 0.0 : 1e-4, 16);
    if (k % 3 == 0) add_series(scene, SeriesKind::dark, 1.0, 8);
    for (int level = 1; level <= 12; ++level) add_series(scene, SeriesKind::flat, 0.1 * level, frames);
    const Measurement m = measure_scene(scene);
    for (const Finding& f : m.result.findings)
      CHECK_MESSAGE(f.severity == Severity::info, "camera ", k, ", ", f.code, ": ", f.message);
    gain.add(quantity(m.result, "conversion_gain_dn_per_e"), m.truth[0].conversion_gain_dn_per_e);
    noise.add(quantity(m.result, "read_noise_e"), m.truth[0].read_noise_e);
    CHECK(quantity(m.result, "saturation_capacity_e").value);
  }
  for (const Pulls* pulls : {&gain, &noise}) {
    INFO("mean ", pulls->mean(), " spread ", pulls->spread(), " inside ", pulls->inside);
    CHECK(pulls->missing == 0);
    CHECK(std::abs(pulls->mean()) < 4 / std::sqrt(60.0));
    CHECK(pulls->spread() < 1 + 4 / std::sqrt(120.0));
    CHECK(pulls->inside >= 50);
  }
}
