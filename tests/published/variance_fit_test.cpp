#include <array>
#include <cmath>
#include <random>
#include <vector>

#include "check_row.h"
#include "model/clipping.h"
#include "model/jackknife.h"
#include "model/line_fit.h"
#include "model/moments.h"
#include "model/read_noise.h"
#include "model/variance_curve.h"
#include "model/variance_line.h"

using namespace evenfield;

namespace {

const std::vector<VariancePoint> kWorked{
    {0, 1.1, 1e4}, {100, 51, 1e4}, {200, 103, 1e4}, {400, 199, 1e4}, {800, 405, 1e4}};
constexpr const char* kArithmetic = "40-digit arithmetic on the listed levels";

/// Relative error of a variance of `degrees` (even) degrees of freedom: chi^2 / nu from exponentials.
double scatter(std::mt19937_64& engine, int degrees) {
  double sum = 0;
  for (int i = 0; i < degrees / 2; ++i) {
    sum -= 2 * std::log((static_cast<double>(engine() >> 11) + 0.5) * 0x1p-53);
  }
  return sum / degrees;
}

}  // namespace

TEST_CASE("the maximum likelihood line through the worked levels") {
  const auto line = fit_variance_line(kWorked);
  REQUIRE(line);
  REQUIRE(line->converged);
  const auto noise = read_noise_from_line(*line, 1.0 / 12);
  REQUIRE(noise);
  VarianceLine uncorrelated = *line;
  uncorrelated.covariance = 0;
  const auto without = read_noise_from_line(uncorrelated, 1.0 / 12);
  REQUIRE(without);
  const std::array rows{
      CheckRow{"PF-01", "K", line->slope, 0.50203936806745, 1e-11, Mark::derived, kArithmetic},
      CheckRow{"PF-01", "b", line->intercept, 1.09996591136211, 1e-11, Mark::derived, kArithmetic},
      CheckRow{"PF-02", "u(K)", std::sqrt(line->slope_variance), 0.00358685700909, 1e-10, Mark::derived,
               kArithmetic},
      CheckRow{"PF-02", "u(b)", std::sqrt(line->intercept_variance), 0.0155542395482, 1e-10, Mark::derived,
               kArithmetic},
      CheckRow{"PF-02", "correlation", line->correlation(), -0.0201173952, 1e-10, Mark::derived, kArithmetic},
      CheckRow{"PF-02", "chi^2", line->chi2, 2.45714268374, 1e-10, Mark::derived, kArithmetic},
      CheckRow{"PF-03", "r", noise->value_e, 2.00837236568, 1e-10, Mark::derived, kArithmetic},
      CheckRow{"PF-03", "u(r)", noise->standard_uncertainty_e, 0.0212322735461, 1e-10, Mark::derived,
               kArithmetic},
      CheckRow{"PF-03", "u(r) without covariance", without->standard_uncertainty_e, 0.0210223568582, 1e-10,
               Mark::derived, kArithmetic},
  };
  check_rows(rows);
  std::vector<LinePoint> plain;
  for (const VariancePoint& point : kWorked) plain.push_back({point.x, point.variance});
  const auto ordinary = fit_line(plain);
  for (LinePoint& point : plain) point.y -= kWorked.front().variance;
  const auto origin = fit_line_through_origin(plain);
  REQUIRE(ordinary);
  REQUIRE(origin);
  const std::array unweighted{
      CheckRow{"PF-01", "unweighted slope", ordinary->slope, 0.503925, 1e-9, Mark::derived, kArithmetic},
      CheckRow{"PF-01", "unweighted intercept", ordinary->intercept, 0.6425, 1e-9, Mark::derived,
               kArithmetic},
      CheckRow{"PF-01", "slope through the origin", origin->slope, 0.503117647058824, 1e-12, Mark::derived,
               "sum x v / sum x^2; EMVA 1288, from memory"},
  };
  check_rows(unweighted);
}

TEST_CASE("the bound of gain and read noise at given levels") {
  constexpr double kGain = 0.5, kReadNoise = 2, kStep = 1.0 / 12, kIntercept = 1 + kStep;
  struct Row {
    const char* id;
    std::vector<double> electrons;
    double degrees;
    double gain, intercept, correlation, noise;  // relative uncertainties
    double tolerance;                            // relative
  };
  const std::vector<double> lit{1000, 2000, 3000, 4000, 5000, 6000, 7000, 8000, 9000, 10000};
  std::vector<double> with_dark{0}, spread{0};
  with_dark.insert(with_dark.end(), lit.begin(), lit.end());
  for (int i = 0; i < 10; ++i) spread.push_back(10 * std::pow(1000.0, i / 9.0));
  const std::vector<Row> table{
      {"PF-04", with_dark, 1e6, 4.4778392e-4, 1.4142044e-3, -0.0040003, 8.8884912e-4, 1e-7},
      {"PF-04", with_dark, 1e4, 4.4778392e-3, 1.4142044e-2, -0.0040003, 8.8884912e-3, 1e-7},
      {"PF-04", with_dark, 15e6, 1.1561731e-4, 3.6514602e-4, -0.0040003, 2.2949986e-4, 1e-7},
      {"PF-05", lit, 1e6, 6.7019342e-4, 0.39368175, -0.74404, 0.2137434, 1e-6},
      {"PF-04", spread, 1e6, 4.8121189e-4, 1.3482480e-3, -0.15946, 9.3647505e-4, 1e-7},
      {"PF-04", {0, 10000}, 1e6, 1.4148265e-3, 1.4142136e-3, -0.00043315, 1.6091857e-3, 1e-7},
  };
  constexpr const char* kSource = "inverse of the Fisher information";
  for (const Row& row : table) {
    std::vector<VariancePoint> points;
    for (const double electrons : row.electrons) points.push_back({kGain * electrons, 0, row.degrees});
    const auto bound = variance_line_bound(kIntercept, kGain, points);
    REQUIRE(bound);
    const auto noise = read_noise_from_line(*bound, kStep);
    REQUIRE(noise);
    CHECK(noise->value_e == doctest::Approx(kReadNoise).epsilon(1e-12));
    const double gain = std::sqrt(bound->slope_variance) / kGain;
    const double intercept = std::sqrt(bound->intercept_variance) / kIntercept;
    const std::array rows{
        CheckRow{row.id, "u(K) / K", gain, row.gain, relative(row.tolerance, row.gain), Mark::derived,
                 kSource},
        CheckRow{row.id, "u(b) / b", intercept, row.intercept, relative(row.tolerance, row.intercept),
                 Mark::derived, kSource},
        CheckRow{row.id, "u(r) / r", noise->standard_uncertainty_e / kReadNoise, row.noise,
                 relative(row.tolerance, row.noise), Mark::derived, kSource},
        CheckRow{row.id, "correlation", bound->correlation(), row.correlation, 6e-6, Mark::derived, kSource},
    };
    check_rows(rows);
  }
}

TEST_CASE("weights from the measured variance bias the gain and weights of the model do not") {
  std::mt19937_64 engine(20261124);
  constexpr int kRuns = 20000, kDegrees = 50, kLevels = 10;
  Moments measured_weights, model_weights, pulls;
  for (int run = 0; run < kRuns; ++run) {
    std::vector<LinePoint> origin;
    std::vector<VariancePoint> levels{{0, scatter(engine, 1000), 1000}};
    for (int level = 1; level <= kLevels; ++level) {
      const double factor = scatter(engine, kDegrees);
      const double variance = level * factor;  // shot-limited, K = 1
      origin.push_back({static_cast<double>(level), variance, kDegrees / (2 * variance * variance)});
      const double x = 100.0 * level;
      levels.push_back({x, (1 + 0.5 * x) * factor, kDegrees});
    }
    const auto biased = fit_line_through_origin(origin);
    const auto line = fit_variance_line(levels);
    REQUIRE(biased);
    REQUIRE(line);
    REQUIRE(line->converged);
    measured_weights.add(biased->slope - 1);
    model_weights.add(line->slope / 0.5 - 1);
    pulls.add((line->slope - 0.5) / std::sqrt(line->slope_variance));
  }
  const std::array rows{
      CheckRow{"PF-06", "bias of measured weights", *measured_weights.mean(), -0.072, 0.005, Mark::derived,
               "-4 (1 - 1/L) / nu, second order; a Monte Carlo run gave -0.070"},
  };
  check_rows(rows);
  CHECK(std::abs(*model_weights.mean()) < 0.002);  // 4.5 standard errors of sqrt(2 / (nu L) / runs) = 4.5e-4
  CHECK(std::sqrt(*pulls.variance()) == doctest::Approx(1).epsilon(0.03));  // attains its bound
}

TEST_CASE("the jackknife of a mean is its standard error and clipping narrows a variance") {
  Matrix left_out(5, 2);
  for (int block = 0; block < 5; ++block) {
    left_out(block, 0) = (15.0 - (block + 1)) / 4;  // mean of 1..5 without one
    left_out(block, 1) = -2 * left_out(block, 0);
  }
  const auto result = jackknife(left_out);
  REQUIRE(result);
  const std::array rows{
      CheckRow{"PF-07", "standard error", std::sqrt(result->covariance(0, 0)), 0.7071067812, 1e-10,
               Mark::derived, "s / sqrt(n) of 1..5"},
      CheckRow{"PF-07", "covariance with -2 times it", result->covariance(0, 1), -1, 1e-10, Mark::derived,
               "-2 s^2 / n"},
      CheckRow{"PF-08", "variance after clipping at 3 s", clipped_variance_factor(3), 0.9733369, 1e-6,
               Mark::derived, "truncated normal"},
  };
  check_rows(rows);
}

TEST_CASE("the curved relation and its fit") {
  // g = 2 e-/DN, n00 = 25 e-^2.
  constexpr double kGain = 0.5, kIntercept = 25.0 / 4, kCurvature = -2.4e-6;
  struct Row {
    double signal_dn, variance_dn2;
  };
  constexpr Row kRows[] = {
      {1000, 503.857662}, {10000, 4773.749163}, {25000, 11119.382236}, {40000, 16613.988168}};
  std::vector<VariancePoint> points{{0, kIntercept, 1e6}};
  for (const Row& row : kRows) {
    const double variance = curved_variance(row.signal_dn, kIntercept, kGain, kCurvature);
    const std::array rows{CheckRow{"BF-01", "variance", variance, row.variance_dn2, 1e-5, Mark::derived,
                                   "Astier et al. 2019, equation 16 (from memory), arithmetic"}};
    check_rows(rows);
    points.push_back({row.signal_dn, row.variance_dn2, 1e6});
  }
  const auto curve = fit_variance_curve(points);
  REQUIRE(curve);
  REQUIRE(curve->converged);
  // The listed variances are rounded to 1e-6 DN^2, a part in 1e8 of the lowest.
  CHECK(curve->slope == doctest::Approx(kGain).epsilon(1e-7));
  CHECK(curve->intercept == doctest::Approx(kIntercept).epsilon(1e-6));
  CHECK(curve->curvature == doctest::Approx(kCurvature).epsilon(1e-6));
}
