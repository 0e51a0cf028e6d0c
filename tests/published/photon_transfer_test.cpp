#include <array>
#include <vector>

#include "check_row.h"
#include "model/gain_bias.h"
#include "model/quantization.h"
#include "model/read_noise.h"
#include "model/spatial.h"
#include "model/stack_variance.h"

using namespace evenfield;

namespace {

using Frames = std::vector<std::vector<double>>;
const Frames kPair{{10, 12, 11, 15}, {12, 11, 14, 17}};
const Frames kThree{{10, 12, 11, 15}, {12, 11, 14, 17}, {11, 14, 12, 14}};
constexpr const char* kArithmetic = "arithmetic on the listed frames";

}  // namespace

TEST_CASE("the variance of a pair and of three frames follows its definition") {
  const auto pair = temporal_variance(kPair);
  const auto three = temporal_variance(kThree);
  REQUIRE(pair);
  REQUIRE(three);
  const std::array rows{
      CheckRow{"PT-01", "two frames, no drift term", pair->raw, 2.25, 1e-12, Mark::derived, kArithmetic},
      CheckRow{"PT-02", "two frames, drift-corrected", pair->corrected, 1.125, 1e-12, Mark::derived,
               kArithmetic},
      CheckRow{"PT-02", "the same, unbiased", pair->unbiased, 1.5, 1e-12, Mark::derived, kArithmetic},
      CheckRow{"PT-03", "three frames, raw", three->raw, 2.0, 1e-7, Mark::derived, kArithmetic},
      CheckRow{"PT-03", "drift", three->drift, 0.5625, 1e-7, Mark::derived, kArithmetic},
      CheckRow{"PT-03", "corrected", three->corrected, 1.4375, 1e-7, Mark::derived, kArithmetic},
      CheckRow{"PT-03", "unbiased", three->unbiased, 1.9166667, 1e-7, Mark::derived, kArithmetic},
  };
  check_rows(rows);
}

TEST_CASE("flicker, compression and the unweighted line disturb the gain as derived") {
  const std::array<double, 10> levels{1, 2, 3, 4, 5, 6, 7, 8, 9, 10};
  const std::array rows{
      CheckRow{"PT-04", "excess of the variance by flicker", flicker_variance_excess(1e-3, 1e4), 0.01,
               relative(1e-12, 0.01), Mark::derived, "(d Ne)^2 / Ne"},
      CheckRow{"PT-07", "unweighted line over best weights", origin_line_inefficiency(levels), 1.3073220372,
               1e-9, Mark::derived, "sqrt(10 x 25333) / 385"},
      CheckRow{"PT-08", "gain after 1 % compression", compressed_gain_ratio(0.01), 0.9701010101, 1e-9,
               Mark::derived, "0.98^2 / 0.99"},
  };
  check_rows(rows);
}

TEST_CASE("flicker of noiseless frames appears in the raw variance and goes with the drift term") {
  // Two frames at Ne (1 +- d / sqrt 2) have the relative sample variance d^2.
  const double signal = 1e4, step = 1e-3 / std::sqrt(2.0) * signal;
  const auto variance =
      temporal_variance(Frames{{signal + step, signal + step}, {signal - step, signal - step}});
  REQUIRE(variance);
  CHECK(variance->raw / signal == doctest::Approx(flicker_variance_excess(1e-3, signal)).epsilon(1e-9));
  CHECK(std::abs(variance->corrected) < 1e-9);
}

TEST_CASE("the sampling variance of a variance holds for Poisson electrons with normal noise") {
  const PoissonCamera camera{0.5, 5, 1};
  const std::array rows{
      CheckRow{"PT-05", "Var(V)", variance_of_variance(camera, 20, 4), 0.17265625, 1e-12, Mark::derived,
               "cumulants, checked by a Monte Carlo run"},
      CheckRow{"PT-06", "Var(V - K mean)", variance_of_line_residual(camera, 20, 4), 0.171875, 1e-12,
               Mark::derived, "cumulants, checked by a Monte Carlo run"},
  };
  check_rows(rows);
}

TEST_CASE("a rounded normal variable has the variance of the table") {
  struct Row {
    double spread;
    double at_code, quarter, half;
  };
  // Direct summation over codes; printed to six places.
  constexpr Row kRows[] = {{0.2, 0.012419, 0.094595, 0.250001}, {0.3, 0.095582, 0.170116, 0.251716},
                           {0.4, 0.211830, 0.243148, 0.274841}, {0.5, 0.325413, 0.333328, 0.341254},
                           {0.6, 0.442069, 0.443333, 0.444597}, {0.8, 0.723325, 0.723333, 0.723342}};
  constexpr const char* kSource = "characteristic function, direct summation";
  for (const Row& row : kRows) {
    CAPTURE(row.spread);
    const std::array rows{
        CheckRow{"QZ-01", "mean on a code", rounded_normal(100, row.spread).variance, row.at_code, 1e-6,
                 Mark::derived, kSource},
        CheckRow{"QZ-01", "mean at a quarter", rounded_normal(100.25, row.spread).variance, row.quarter, 1e-6,
                 Mark::derived, kSource},
        CheckRow{"QZ-01", "mean at a half", rounded_normal(100.5, row.spread).variance, row.half, 1e-6,
                 Mark::derived, kSource},
    };
    check_rows(rows);
  }
}

TEST_CASE("unresolved dark noise has the limits of the standard") {
  const std::array rows{
      CheckRow{"QZ-02", "limit without rounding", unresolved_noise_limit(1), 0.3958114, 1e-7,
               Mark::from_memory, "EMVA 1288, rule of 0.24 DN^2; arithmetic derived"},
      CheckRow{"QZ-02", "limit with rounding", unresolved_noise_limit_with_rounding(1), 0.4898979, 1e-7,
               Mark::from_memory, "EMVA 1288, rule of 0.24 DN^2; arithmetic derived"},
  };
  check_rows(rows);
  CHECK(unresolved_noise_limit(16) == doctest::Approx(16 * 0.3958114));  // codes 16 apart
}

TEST_CASE("a standard deviation of few frames is biased by known factors") {
  struct Row {
    int frames;
    double mean, median;
  };
  constexpr Row kRows[] = {{2, 0.7978846, 0.6744898},  {3, 0.8862269, 0.8325546},  {5, 0.9399856, 0.9160641},
                           {10, 0.9726593, 0.9627987}, {16, 0.9834835, 0.9777136}, {25, 0.9896404, 0.9860850},
                           {100, 0.9974780, 0.9966314}};
  for (const Row& row : kRows) {
    CAPTURE(row.frames);
    const std::array rows{
        CheckRow{"RN-01", "c4", deviation_bias(row.frames), row.mean, 1e-7, Mark::derived, "gamma functions"},
        CheckRow{"RN-01", "median factor", deviation_median(row.frames), row.median, 1e-7, Mark::derived,
                 "median of chi square"},
    };
    check_rows(rows);
  }
}

TEST_CASE("the split of three pixels in four frames agrees with ISO 15739") {
  const auto stack = temporal_variance(Frames{{1, 4, 7}, {2, 5, 8}, {3, 5, 9}, {6, 6, 12}});
  REQUIRE(stack);
  constexpr const char* kSource = "ISO 15739 (formulas from memory), arithmetic on the listed data";
  const std::array rows{
      CheckRow{"RN-02", "sigma_diff^2", stack->raw * 3 / 4, 2.5, 1e-7, Mark::derived, kSource},
      CheckRow{"RN-02", "sigma_temp^2", stack->raw, 10.0 / 3, 1e-7, Mark::derived, kSource},
      CheckRow{"RN-02", "sigma_ave^2", stack->mean_image_variance, 28.0 / 3, 1e-7, Mark::derived, kSource},
      CheckRow{"RN-02", "sigma_fp^2", spatial_variance(stack->mean_image_variance, stack->raw, 4), 8.5, 1e-7,
               Mark::derived, kSource},
  };
  check_rows(rows);
}
