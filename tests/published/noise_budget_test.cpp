#include "model/noise_budget.h"

#include <array>

#include "check_row.h"
#include "model/clipping.h"
#include "model/quantization.h"
#include "model/radiometry.h"

using namespace evenfield;

namespace {

// The worked camera of the rows below.
constexpr double kGain = 0.5, kReadNoise = 2, kEfficiency = 0.7, kSaturation = 30000;
double dark_noise() { return dark_noise_dn(kGain, kReadNoise, quantization_variance(1)) / kGain; }

}  // namespace

TEST_CASE("threshold, dynamic range and signal-to-noise ratio of the worked camera") {
  const double noise = dark_noise();
  constexpr const char* kSource = "formulas of EMVA 1288 chapter 2 (from memory), arithmetic";
  const double range = dynamic_range(kSaturation, noise);
  const std::array rows{
      CheckRow{"SN-01", "dark noise [DN]", noise * kGain, 1.0408330, 1e-7, Mark::derived, kSource},
      CheckRow{"SN-01", "threshold [photons], as printed", threshold_e(noise) / kEfficiency, 3.6880943, 1e-7,
               Mark::derived, kSource},
      CheckRow{"SN-01", "threshold [photons], exact", exact_threshold_e(noise) / kEfficiency, 3.7726744, 1e-7,
               Mark::derived, kSource},
      CheckRow{"SN-01", "threshold [e-]", threshold_e(noise), 2.581666, 1e-6, Mark::derived, kSource},
      CheckRow{"SN-02", "dynamic range", range, 11620.40, 0.005, Mark::derived, kSource},
      CheckRow{"SN-02", "dynamic range [dB]", decibels(range), 81.304424, 1e-6, Mark::derived, kSource},
      CheckRow{"SN-02", "dynamic range [bit]", bits(range), 13.5044, 5e-5, Mark::derived, kSource},
      CheckRow{"SN-02", "largest ratio", maximum_signal_to_noise(kSaturation), 173.2051, 5e-5, Mark::derived,
               kSource},
      CheckRow{"SN-02", "largest ratio [dB]", decibels(maximum_signal_to_noise(kSaturation)), 44.771213, 1e-6,
               Mark::derived, kSource},
      CheckRow{"SN-03", "ratio at 10 photons", signal_to_noise(10 * kEfficiency, noise), 2.0793098, 1e-6,
               Mark::derived, kSource},
      CheckRow{"SN-03", "ratio at 100 photons", signal_to_noise(100 * kEfficiency, noise), 8.1190691, 1e-6,
               Mark::derived, kSource},
      CheckRow{"SN-03", "ratio at 1000 photons", signal_to_noise(1000 * kEfficiency, noise), 26.375999, 1e-6,
               Mark::derived, kSource},
      CheckRow{"SN-03", "ratio at 10000 photons", signal_to_noise(10000 * kEfficiency, noise), 83.640118,
               1e-6, Mark::derived, kSource},
      CheckRow{"SN-04", "total ratio at saturation", total_signal_to_noise(kSaturation, noise, 1.5, 0.005),
               130.922526, 1e-6, Mark::derived, kSource},
      CheckRow{"SN-01", "ratio at the printed threshold", signal_to_noise(threshold_e(noise), noise), 0.98176,
               5e-6, Mark::derived, kSource},
      CheckRow{"SN-01", "ratio at the exact threshold", signal_to_noise(exact_threshold_e(noise), noise), 1,
               1e-12, Mark::derived, "definition"},
  };
  check_rows(rows);
}

TEST_CASE("the uncertainty of the dynamic range is that of its two signals in DN") {
  // Numerical derivative of x_sat / (sigma + K / 2) with relative steps of 1e-6, signals in DN.
  const double noise = dark_noise(), step = 1e-6;
  const double base = dynamic_range(kSaturation, noise);
  const double by_saturation = (dynamic_range(kSaturation * (1 + step), noise) / base - 1) / step;
  const double by_noise = (dynamic_range(kSaturation, noise * (1 + step)) / base - 1) / step;
  const double expected = std::hypot(by_saturation * 0.003, by_noise * 0.002);
  CHECK(dynamic_range_relative_uncertainty(0.003, 0.002, noise) == doctest::Approx(expected).epsilon(1e-5));
  CHECK(decibel_uncertainty(0.01) == doctest::Approx(0.08686).epsilon(1e-4));  // JCGM 100: 8.686 u_rel
}

TEST_CASE("the level of a small clipped share follows the normal tail") {
  const auto tenth = mean_at_clipped_fraction(4095, 0.1, 1, 0.001);
  const auto fifth = mean_at_clipped_fraction(4095, 0.1, 1, 0.002);
  REQUIRE(tenth);
  REQUIRE(fifth);
  const double sigma = std::sqrt(1 + 0.1 * *fifth);
  constexpr const char* kSource = "P(y >= FS - 0.5) of a normal variable";
  const std::array rows{
      CheckRow{"SAT-01", "mean at 0.1 % clipped", *tenth, 4032.3689, 1e-3, Mark::derived, kSource},
      CheckRow{"SAT-01", "mean at 0.2 % clipped", *fifth, 4036.6024, 1e-3, Mark::derived, kSource},
      CheckRow{"SAT-01", "its uncertainty, 1e6 pixels", clipped_mean_uncertainty(0.002, 1e6, sigma), 0.14,
               5e-3, Mark::derived, "binomial spread over the slope of the tail"},
  };
  check_rows(rows);
}

TEST_CASE("photons and responsivity follow the constants of the SI") {
  constexpr const char* kSource = "SI 2019, exact constants";
  const std::array rows{
      CheckRow{"RA-01", "1/(hc)", photons_per_joule_metre(), 5.034116567543e24,
               relative(1e-9, 5.034116567543e24), Mark::published, kSource},
      CheckRow{"RA-01", "hc/e [eV um]", photon_energy_ev_um(), 1.239841984, relative(1e-9, 1.239841984),
               Mark::published, kSource},
      // 0.1 uW/cm^2 is 1e-3 W/m^2.
      CheckRow{"RA-02", "photons per pixel", photons_per_pixel(6.5, 525, 1e-3, 0.01), 1116.62998, 1e-5,
               Mark::derived, kSource},
      CheckRow{"RA-03", "A/W at 400 nm", responsivity_a_per_w(1, 400), 0.3226218, 1e-7, Mark::derived,
               kSource},
      CheckRow{"RA-03", "A/W at 800 nm", responsivity_a_per_w(1, 800), 0.6452435, 1e-7, Mark::derived,
               kSource},
      CheckRow{"RA-03", "A/W at 1100 nm", responsivity_a_per_w(1, 1100), 0.8872098, 1e-7, Mark::derived,
               kSource},
      CheckRow{"RA-03", "A/W at 190 nm", responsivity_a_per_w(1, 190), 0.153245, 5e-7, Mark::derived,
               kSource},
      CheckRow{"RA-03", "A/W at 525 nm", responsivity_a_per_w(1, 525), 0.423441, 5e-7, Mark::derived,
               kSource},
      CheckRow{"RA-01", "photon energy at 1.1 um [eV]", photon_energy_ev_um() / 1.1, 1.12713, 5e-6,
               Mark::derived, kSource},
      CheckRow{"RA-01", "Boltzmann constant [eV/K]", kBoltzmannElectronVoltPerKelvin, 8.617333262e-5, 1e-14,
               Mark::published, kSource},
  };
  check_rows(rows);
}
