#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <random>
#include <vector>

#include "model/clipping.h"
#include "model/gum.h"
#include "model/jackknife.h"
#include "model/linearity.h"
#include "model/moments.h"
#include "model/quantization.h"
#include "model/read_noise.h"
#include "model/stack_variance.h"
#include "model/student.h"

using namespace evenfield;

TEST_CASE("both ways to the variance of a rounded normal variable meet") {
  for (const double mean : {10.0, 10.2, 10.5, 10.77}) {
    CAPTURE(mean);
    // Codes are summed below a spread of 1/2, the series is used from there: continuous to the step of the
    // spread.
    const RoundedNormal below = rounded_normal(mean, std::nextafter(0.5, 0));
    const RoundedNormal above = rounded_normal(mean, 0.5);
    CHECK(std::abs(below.mean - above.mean) < 1e-12);
    CHECK(std::abs(below.variance - above.variance) < 1e-12);
  }
  CHECK(rounded_normal(10.3, 0).variance == 0);
  CHECK(rounded_normal(10.3, 0).mean == 10);
  CHECK(rounded_normal(10.5, 1e-9).variance == doctest::Approx(0.25));  // half of the samples on either code
  CHECK(rounded_normal(65535.25, 20).variance == doctest::Approx(400 + 1.0 / 12).epsilon(1e-12));
}

TEST_CASE("quantiles undo their distribution functions and answer NaN outside") {
  for (const double probability : {0.001, 0.05, 0.5, 0.9, 0.9999}) {
    CHECK(normal_cumulative(normal_quantile(probability)) == doctest::Approx(probability).epsilon(1e-12));
    CHECK(student_cumulative(student_quantile(probability, 3.7), 3.7) ==
          doctest::Approx(probability).epsilon(1e-10));
    CHECK(chi_square_excess(chi_square_quantile(probability, 5), 5) ==
          doctest::Approx(1 - probability).epsilon(1e-10));
  }
  CHECK(coverage_factor(0.95, {}) == doctest::Approx(1.959963985).epsilon(1e-9));  // normal tables
  CHECK(coverage_factor(0.95, std::numeric_limits<double>::infinity()) == coverage_factor(0.95, {}));
  CHECK(coverage_factor(0.95, 1e7) == doctest::Approx(coverage_factor(0.95, {})).epsilon(1e-6));
  CHECK(std::isnan(student_quantile(0.9, -1)));
  CHECK(std::isnan(student_quantile(1.5, 4)));
  CHECK(std::isnan(normal_quantile(-0.1)));
  CHECK(std::isnan(chi_square_quantile(0.5, 0)));
  CHECK(std::isnan(deviation_bias(1)));
  CHECK(std::isnan(deviation_median(0)));
}

TEST_CASE("what cannot be known is absent or an error") {
  CHECK_FALSE(Moments().mean());
  CHECK_FALSE(Moments().variance());
  Moments one;
  one.add(5);
  CHECK(one.mean() == 5.0);
  CHECK_FALSE(one.variance());
  one.merge(Moments());
  CHECK(one.count() == 1);
  CHECK_FALSE(lag_one_correlation(std::vector<double>{1}));
  CHECK_FALSE(lag_one_correlation(std::vector<double>{2, 2, 2}));
  CHECK_FALSE(read_noise_from_dark(1.0 / 12, 1e6, 1.0 / 12, 0.5, 0.001));
  CHECK_FALSE(read_noise_from_line(VarianceLine{}, 1.0 / 12));
  CHECK_FALSE(mean_at_clipped_fraction(4095, 0.1, 1, 0.6));
  CHECK_FALSE(mean_at_clipped_fraction(4095, 0.1, 1, 0));
  CHECK_FALSE(mean_at_clipped_fraction(10, 100, -5000, 0.002));
  CHECK_FALSE(temporal_variance(std::vector<std::vector<double>>{{1, 2}}));
  const auto ragged = temporal_variance(std::vector<std::vector<double>>{{1, 2}, {1, 2, 3}});
  REQUIRE_FALSE(ragged);
  CHECK(ragged.error().what == "temporal variance, frame 2: found 3 pixels, expected 2");
  CHECK_FALSE(fit_linearity(std::vector<ResponsePoint>{{1, 1}, {2, 2}}));
  const auto negative = fit_linearity(std::vector<ResponsePoint>{{1, 1}, {2, 2}, {3, -3}});
  REQUIRE_FALSE(negative);
  CHECK(negative.error().what.find("level 3") != std::string::npos);
}

TEST_CASE("read noise from darks is that of the closed form") {
  // V = 1 + 1/12, K = 1/2: r = 2; u(r)/r = (V / (V - q)) / sqrt(2 nu) with a gain known exactly (METHODS 2).
  const auto noise = read_noise_from_dark(1 + 1.0 / 12, 1e6, 1.0 / 12, 0.5, 0);
  REQUIRE(noise);
  CHECK(noise->value_e == doctest::Approx(2).epsilon(1e-14));
  CHECK(noise->standard_uncertainty_e == doctest::Approx(2 * 13.0 / 12 / std::sqrt(2e6)).epsilon(1e-12));
  const auto with_gain = read_noise_from_dark(1 + 1.0 / 12, 1e6, 1.0 / 12, 0.5, 0.01);
  REQUIRE(with_gain);
  CHECK(with_gain->standard_uncertainty_e == doctest::Approx(0.02).epsilon(0.01));
}

TEST_CASE("the noise floor of the linearity error is what noise alone shows") {
  std::mt19937_64 engine(17);
  Moments error;
  for (int run = 0; run < 400; ++run) {
    std::vector<ResponsePoint> points;
    for (int level = 1; level <= 100; ++level) {
      double sum = -6;  // twelve uniform numbers make a normal one
      for (int i = 0; i < 12; ++i) sum += static_cast<double>(engine() >> 11) * 0x1p-53;
      points.push_back({static_cast<double>(level), 100.0 * level * (1 + 0.001 * sum)});
    }
    const auto linearity = fit_linearity(points);
    REQUIRE(linearity);
    error.add(linearity->error_percent);
  }
  // A hundred levels lose 1 % of the spread to the two parameters; the mean of 40000 deviations is known to
  // 0.4 %.
  CHECK(error.mean().value() == doctest::Approx(0.99 * linearity_floor_percent(0.001)).epsilon(0.02));
}

TEST_CASE("matrices that do not fit and values that are not finite are refused") {
  CHECK_FALSE(propagate(Matrix(1, 2), Matrix(3, 3)));
  CHECK_FALSE(propagate(Matrix(1, 2), Matrix(2, 1)));
  CHECK_FALSE(covariance_of_means(Matrix(1, 2)));
  CHECK_FALSE(jackknife(Matrix(1, 1)));
  Matrix left_out(3, 2);
  left_out(1, 1) = std::numeric_limits<double>::infinity();
  const auto result = jackknife(left_out);
  REQUIRE_FALSE(result);
  CHECK(result.error().what.find("statistic 2 without block 2: found inf") != std::string::npos);
  CHECK(correlation_of(Matrix(2, 2))(0, 1) == 0);
  CHECK(std::isinf(
      effective_degrees_of_freedom(std::vector<Contribution>{{1, std::numeric_limits<double>::infinity()}})));
  // Units as small as an irradiance in W/pixel must not underflow.
  const std::vector<Contribution> small{{1e-120, 4}, {1e-120, 4}};
  CHECK(effective_degrees_of_freedom(small) == doctest::Approx(8));
}

TEST_CASE(
    "the median of deviations of pixels that differ lies between that of equal ones and their mean "
    "logarithm") {
  // F = 16: 0.9777136 for equal pixels (METHODS 2); exp(E ln S) = exp((digamma(7.5) - ln 7.5) / 2) = 0.9661
  // for a wide population. Half of the variance from the population: the middle of the logarithms.
  CHECK(deviation_median(16, 0.0) == doctest::Approx(0.9777136).epsilon(1e-6));
  const double own = deviation_log_variance(16);
  CHECK(own == doctest::Approx(0.03565397).epsilon(1e-6));  // trigamma(7.5) / 4, SciPy
  const double wide = deviation_median(16, 1e6);
  CHECK(wide == doctest::Approx(0.9665012).epsilon(1e-6));
  CHECK(deviation_median(16, 2 * own) == doctest::Approx(std::sqrt(0.9777136 * wide)).epsilon(1e-5));
}
