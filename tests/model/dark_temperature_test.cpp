#include "model/dark_temperature.h"

#include <doctest/doctest.h>

using namespace evenfield;

TEST_CASE("warming by the doubling step doubles the rate") {
  for (const double energy : {0.4, 0.65, 1.12})
    for (const double temperature : {150.0, 253.15, 333.0}) {
      CAPTURE(energy);
      CAPTURE(temperature);
      const auto step = doubling_step_k(energy, temperature);
      REQUIRE(step);
      CHECK(arrhenius_ratio(energy, temperature, temperature + *step) == doctest::Approx(2).epsilon(1e-12));
      // Warmer, the relative slope Ea/(k T^2) is less than at T.
      CHECK(local_doubling_step_k(energy, temperature) < *step);
    }
}

TEST_CASE("the energy of two rates is that of the law they follow") {
  const double ratio = arrhenius_ratio(0.62, 263.15, 293.15);
  CHECK(ratio > 1);
  const auto energy = activation_energy_ev(3 * ratio, 293.15, 3, 263.15);
  REQUIRE(energy);
  CHECK(*energy == doctest::Approx(0.62).epsilon(1e-13));
  CHECK(*activation_energy_ev(3, 263.15, 3 * ratio, 293.15) == doctest::Approx(0.62).epsilon(1e-13));
  CHECK(*activation_energy_ev(3, 293.15, 3 * ratio, 263.15) == doctest::Approx(-0.62).epsilon(1e-13));
  // Numerical derivative: a rate larger by 1 % moves the energy by the uncertainty of 1 %.
  const auto moved = activation_energy_ev(3 * ratio * 1.0001, 293.15, 3, 263.15);
  const auto one_sided = activation_energy_uncertainty_ev(0.0001, 293.15, 0, 263.15);
  CHECK(*moved - *energy == doctest::Approx(*one_sided).epsilon(1e-4));
  CHECK(*activation_energy_uncertainty_ev(0.0003, 293.15, 0.0004, 263.15) ==
        doctest::Approx(5 * *one_sided).epsilon(1e-12));
}

TEST_CASE("what has no energy or no doubling step has none") {
  CHECK_FALSE(activation_energy_ev(1, 293, 2, 293));
  CHECK_FALSE(activation_energy_ev(0, 293, 2, 273));
  CHECK_FALSE(activation_energy_ev(-1, 293, 2, 273));
  CHECK_FALSE(activation_energy_ev(1, 0, 2, 273));
  CHECK_FALSE(activation_energy_uncertainty_ev(0.1, 293, 0.1, 293));
  CHECK_FALSE(doubling_step_k(0, 293.15));
  CHECK_FALSE(doubling_step_k(-0.6, 293.15));
  CHECK_FALSE(doubling_step_k(0.6, 0));
  // k T ln 2 = 17.5 meV at 293.15 K: below it, even endless warming does not double the rate.
  CHECK_FALSE(doubling_step_k(0.0175, 293.15));
  CHECK(doubling_step_k(0.0176, 293.15));
  CHECK_FALSE(silicon_doubling_step_k(20));
  CHECK_FALSE(silicon_doubling_step_k(500));
}

TEST_CASE("silicon doubles after its doubling step at the ends of the model too") {
  for (const double temperature : {50.0, 120.0, 293.15, 400.0}) {
    CAPTURE(temperature);
    const auto step = silicon_doubling_step_k(temperature);
    REQUIRE(step);
    CHECK(silicon_dark_ratio(temperature + *step, temperature) == doctest::Approx(2).epsilon(1e-9));
  }
}
