#include "model/variance_line.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <random>
#include <vector>

#include "model/moments.h"
#include "model/variance_curve.h"

using namespace evenfield;

namespace {

/// chi^2 / nu of an even number of degrees of freedom, from exponentials: the same on every machine.
double scatter(std::mt19937_64& engine, int degrees) {
  double sum = 0;
  for (int i = 0; i < degrees / 2; ++i) {
    sum -= 2 * std::log((static_cast<double>(engine() >> 11) + 0.5) * 0x1p-53);
  }
  return sum / degrees;
}

}  // namespace

TEST_CASE("the likelihood is at its maximum where the fit stops") {
  // The score of the gamma likelihood, sum nu (V - m) / (2 m^2) and the same times x, vanishes at the
  // maximum.
  std::mt19937_64 engine(7);
  for (const int degrees : {2, 4, 10, 100}) {
    for (int run = 0; run < 200; ++run) {
      std::vector<VariancePoint> points;
      for (int level = 0; level < 8; ++level) {
        const double x = level == 0 ? 0 : std::pow(4.0, level);
        points.push_back({x, (1.2 + 0.5 * x) * scatter(engine, degrees), static_cast<double>(degrees)});
      }
      const auto line = fit_variance_line(points);
      REQUIRE(line);
      REQUIRE(line->converged);
      double score = 0, score_x = 0;
      for (const VariancePoint& point : points) {
        const double model = line->at(point.x);
        REQUIRE(model > 0);
        const double term = degrees / 2.0 * (point.variance - model) / (model * model);
        score += term;
        score_x += term * point.x;
      }
      CHECK(std::abs(score) * std::sqrt(line->intercept_variance) < 1e-6);
      CHECK(std::abs(score_x) * std::sqrt(line->slope_variance) < 1e-6);
    }
  }
}

TEST_CASE("a gain of few frames over a huge dynamic range is found to its own uncertainty") {
  std::mt19937_64 engine(11);
  Moments pulls_slope, pulls_intercept;
  for (int run = 0; run < 1000; ++run) {
    std::vector<VariancePoint> points;
    for (const double x : {0.0, 3.0, 40.0, 500.0, 6000.0, 60000.0}) {
      points.push_back({x, (2 + 0.02 * x) * scatter(engine, 2000), 2000});
    }
    const auto line = fit_variance_line(points);
    REQUIRE(line);
    REQUIRE(line->converged);
    pulls_slope.add((line->slope - 0.02) / std::sqrt(line->slope_variance));
    pulls_intercept.add((line->intercept - 2) / std::sqrt(line->intercept_variance));
  }
  // Standard errors over 1000 runs: 0.032 of a mean, 0.022 of a spread; bounds at 4.5 of them.
  CHECK(std::abs(pulls_slope.mean().value()) < 0.15);
  CHECK(std::abs(pulls_intercept.mean().value()) < 0.15);
  CHECK(std::abs(std::sqrt(pulls_slope.variance().value()) - 1) < 0.1);
  CHECK(std::abs(std::sqrt(pulls_intercept.variance().value()) - 1) < 0.1);
}

TEST_CASE("units do not matter to the line") {
  const std::vector<VariancePoint> points{{0, 1.1, 1e4}, {100, 51, 1e4}, {200, 103, 1e4}, {400, 199, 1e4}};
  std::vector<VariancePoint> shifted;  // 12 bits in the upper part of 16
  for (const VariancePoint& point : points) {
    shifted.push_back({16 * point.x, 256 * point.variance, point.degrees_of_freedom});
  }
  const auto plain = fit_variance_line(points);
  const auto scaled = fit_variance_line(shifted);
  REQUIRE(plain);
  REQUIRE(scaled);
  CHECK(scaled->slope == doctest::Approx(16 * plain->slope).epsilon(1e-11));
  CHECK(scaled->intercept == doctest::Approx(256 * plain->intercept).epsilon(1e-11));
  CHECK(scaled->chi2 == doctest::Approx(plain->chi2).epsilon(1e-9));
}

TEST_CASE("scatter beyond chance widens, scatter below it does not narrow") {
  const auto even = fit_variance_line(std::vector<VariancePoint>{{0, 1, 1e4}, {1, 2, 1e4}, {2, 3, 1e4}});
  const auto wild = fit_variance_line(std::vector<VariancePoint>{{0, 1, 1e4}, {1, 3, 1e4}, {2, 3, 1e4}});
  REQUIRE(even);
  REQUIRE(wild);
  CHECK(even->spread() == 1);
  CHECK(wild->spread() == doctest::Approx(std::sqrt(wild->chi2)));
  CHECK(wild->spread() > 10);
}

TEST_CASE("levels without a usable variance are named") {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  for (const VariancePoint bad :
       {VariancePoint{5, 0, 10}, VariancePoint{5, -1, 10}, VariancePoint{nan, 1, 10},
        VariancePoint{5, nan, 10}, VariancePoint{5, 1, 0}}) {
    const auto line = fit_variance_line(std::vector<VariancePoint>{{0, 1, 10}, bad, {9, 3, 10}});
    REQUIRE_FALSE(line);
    CHECK(line.error().what.find("level 2") != std::string::npos);
  }
  CHECK_FALSE(fit_variance_line(std::vector<VariancePoint>{{1, 1, 10}}));
  CHECK_FALSE(fit_variance_line(std::vector<VariancePoint>{{1, 1, 10}, {1, 2, 10}}));
  CHECK_FALSE(fit_variance_line({}));
  CHECK_FALSE(variance_line_bound(-1, 0.5, std::vector<VariancePoint>{{0, 0, 10}, {1, 0, 10}}));
  CHECK_FALSE(fit_variance_curve(std::vector<VariancePoint>{{0, 1, 10}, {1, 2, 10}}));
  CHECK_FALSE(fit_variance_curve(std::vector<VariancePoint>{{0, 9, 1e4}, {1, 5, 1e4}, {2, 1, 1e4}}));
}

TEST_CASE("the curve is straight at no curvature and its slope at zero signal is the gain") {
  CHECK(curved_variance(1000, 3, 0.5, 0) == 503);
  // b + K x + a x^2 + (2/3) a^2 x^3 / K: the next term is below 1e-9 of the value here.
  CHECK(curved_variance(100, 3, 0.5, 1e-6) == doctest::Approx(53.01 + 2e-12 / 3 * 1e6 / 0.5).epsilon(1e-9));
  const double step = 1e-3;
  CHECK((curved_variance(step, 3, 0.5, -2e-6) - 3) / step == doctest::Approx(0.5).epsilon(1e-6));
}

TEST_CASE("the curved fit returns gain and curvature to their own uncertainties") {
  for (const double curvature : {-2.5e-6, 0.0, 1e-6}) {
    CAPTURE(curvature);
    std::mt19937_64 engine(13);
    Moments slope, bend;
    for (int run = 0; run < 500; ++run) {
      std::vector<VariancePoint> points;
      for (int level = 0; level <= 12; ++level) {
        const double x = 2500.0 * level;
        // 1 + sqrt(2 / nu) x normal stands for chi^2 of very many degrees of freedom; 64 exponentials make
        // it.
        const double normal = (scatter(engine, 128) - 1) * 8;
        points.push_back({x, curved_variance(x, 5, 0.5, curvature) * (1 + std::sqrt(2e-6) * normal), 1e6});
      }
      const auto curve = fit_variance_curve(points);
      REQUIRE(curve);
      REQUIRE(curve->converged);
      slope.add((curve->slope - 0.5) / std::sqrt(curve->covariance(1, 1)));
      bend.add((curve->curvature - curvature) / std::sqrt(curve->covariance(2, 2)));
    }
    // Standard errors over 500 runs: 0.045 of a mean, 0.032 of a spread; bounds at 4.5 of them.
    CHECK(std::abs(slope.mean().value()) < 0.2);
    CHECK(std::abs(bend.mean().value()) < 0.2);
    CHECK(std::abs(std::sqrt(slope.variance().value()) - 1) < 0.15);
    CHECK(std::abs(std::sqrt(bend.variance().value()) - 1) < 0.15);
  }
}
