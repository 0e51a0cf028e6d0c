#include <array>

#include "check_row.h"
#include "model/dark_temperature.h"

using namespace evenfield;

namespace {

constexpr double kZero = kKelvinAtZeroCelsius, kRoom = kKelvinAtZeroCelsius + 20;
constexpr const char* kArrhenius = "Arrhenius law, exact constant of the SI";

double step(double activation_ev) {
  const auto found = doubling_step_k(activation_ev, kRoom);
  REQUIRE(found);
  return *found;
}

}  // namespace

TEST_CASE("the warming that doubles a dark current follows from its activation energy") {
  const std::array rows{
      CheckRow{"DC-01", "step at 0.8 eV [K]", step(0.8), 6.5599329, 1e-6, Mark::derived, kArrhenius},
      CheckRow{"DC-01", "local step at 0.8 eV [K]", local_doubling_step_k(0.8, kRoom), 6.4163517, 1e-6,
               Mark::derived, kArrhenius},
      CheckRow{"DC-01", "step at 0.55 eV [K]", step(0.55), 9.6398, 5e-5, Mark::derived, kArrhenius},
      CheckRow{"DC-01", "local step at 0.55 eV [K]", local_doubling_step_k(0.55, kRoom), 9.3329, 5e-5,
               Mark::derived, kArrhenius},
      CheckRow{"DC-01", "step at 0.633 eV [K]", step(0.633), 8.3398, 5e-5, Mark::derived, kArrhenius},
      CheckRow{"DC-01", "local step at 0.633 eV [K]", local_doubling_step_k(0.633, kRoom), 8.1091, 5e-5,
               Mark::derived, kArrhenius},
      CheckRow{"DC-01", "step at 1.11 eV [K]", step(1.11), 4.6985, 5e-5, Mark::derived, kArrhenius},
      CheckRow{"DC-01", "local step at 1.11 eV [K]", local_doubling_step_k(1.11, kRoom), 4.6244, 5e-5,
               Mark::derived, kArrhenius},
  };
  check_rows(rows);
}

TEST_CASE("two temperatures give the ratio of dark currents, and two dark currents the energy") {
  const double ratio = arrhenius_ratio(0.633, kZero + 10, kZero + 21);
  const auto energy = activation_energy_ev(10, kRoom, 1.6, kZero);
  REQUIRE(energy);
  constexpr const char* kTest = "radiation test of a CCD for an Earth-imaging instrument, 1990s";
  const std::array rows{
      CheckRow{"DC-02", "ratio 10 to 21 C, digits", ratio, 2.638335, 1e-5, Mark::derived, kArrhenius},
      // Printed with two digits.
      CheckRow{"DC-02", "ratio 10 to 21 C, as printed", ratio, 2.6, 0.05, Mark::via_secondary, kTest},
      CheckRow{"DC-03", "energy of 10 and 1.6 e-/s [eV]", *energy, 0.6322623, 1e-6, Mark::derived,
               kArrhenius},
  };
  check_rows(rows);
}

TEST_CASE("the model of silicon gives its gap, its rates in the cold and its doubling") {
  const auto doubling = silicon_doubling_step_k(kRoom);
  REQUIRE(doubling);
  constexpr const char* kGap = "gap of Rajkanan et al. 1979, arithmetic";
  constexpr const char* kModel = "model of Janesick 2001 (from memory), normalised at 300 K, arithmetic";
  const std::array rows{
      CheckRow{"DC-04", "gap at 300 K [eV]", silicon_gap_ev(300), 1.1108214, 1e-6, Mark::derived, kGap},
      CheckRow{"DC-04", "rate at 273.15 K over 300 K", silicon_dark_ratio(273.15, 300), 0.0907691, 1e-6,
               Mark::derived, kModel},
      CheckRow{"DC-04", "rate at 293.15 K over 300 K", silicon_dark_ratio(293.15, 300), 0.564139, 1e-6,
               Mark::derived, kModel},
      CheckRow{"DC-04", "rate at 253.15 K over 300 K", silicon_dark_ratio(253.15, 300), 0.0111044, 1e-7,
               Mark::derived, kModel},
      CheckRow{"DC-04", "doubling from 293.15 K [K]", *doubling, 8.3331, 5e-5, Mark::derived, kModel},
  };
  check_rows(rows);
}
