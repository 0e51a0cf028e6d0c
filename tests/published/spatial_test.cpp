#include "model/spatial.h"

#include <array>

#include "check_row.h"

using namespace evenfield;

TEST_CASE("DSNU and PRNU of the worked stacks") {
  const double flat = spatial_variance(110, 1000, 100);
  const double dark = spatial_variance(6, 16, 100);
  const SpatialResult prnu = spatial_deviation(flat - dark, 1, 5000 - 100);
  const SpatialResult dsnu = spatial_deviation(dark, 1, 0.5);
  REQUIRE(prnu.value);
  REQUIRE(dsnu.value);
  constexpr const char* kSource = "formulas of EMVA 1288 chapter 8 (from memory), arithmetic";
  const std::array rows{
      CheckRow{"SP-01", "s^2 of the flat", flat, 100, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-01", "s^2 of the dark", dark, 5.84, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-01", "PRNU [%]", 100 * *prnu.value, 0.1980328, 1e-7, Mark::derived, kSource},
      CheckRow{"SP-01", "DSNU [e-]", *dsnu.value, 4.8332184, 1e-7, Mark::derived, kSource},
  };
  check_rows(rows);
}

TEST_CASE("the sampling variances of a spatial variance") {
  const StackSize size{400, 4};
  constexpr const char* kSource = "normal moments, checked by Monte Carlo runs";
  const std::array rows{
      CheckRow{"SP-04", "stack, of a population", spatial_variance_variance_of_population(1, 4, size),
               0.0217168, 1e-6, Mark::derived, kSource},
      CheckRow{"SP-04", "covariance of a pair", frame_pair_covariance_variance(1, 4, 400), 0.0651629, 1e-6,
               Mark::derived, kSource},
      CheckRow{"SP-04b", "given the pattern", spatial_variance_variance(1, 4, size), 0.0166666667, 1e-9,
               Mark::derived, kSource},
  };
  check_rows(rows);
}

TEST_CASE("a negative spatial variance is an upper bound and not a zero") {
  const SpatialResult result = spatial_deviation(-0.5, 1, 2);
  CHECK_FALSE(result.value);
  CHECK_FALSE(result.standard_uncertainty);
  CHECK(result.high95 ==
        doctest::Approx(std::sqrt(-0.5 + 1.6448536) / 2));  // s^2 + 1.645 u, then root and divisor
  const SpatialResult resolved = spatial_deviation(4, 0.16, 2);
  REQUIRE(resolved.standard_uncertainty);
  CHECK(*resolved.standard_uncertainty == doctest::Approx(0.05));  // u(s) = 0.4 / (2 x 2), over 2
}
