#include "model/line_fit.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <vector>

using namespace evenfield;

namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

bool mentions(const Error& error, const char* text) { return error.what.find(text) != std::string::npos; }

}  // namespace

TEST_CASE("a line far from zero keeps the digits that its abscissae have") {
  // y = 3 + x / 4 at 2^40 + k is exact in double; normal equations on raw abscissae would keep nothing of it.
  std::vector<LinePoint> points;
  for (int k = 0; k < 8; ++k) {
    const double x = 0x1p40 + k;
    points.push_back({x, 3 + x / 4});
  }
  const auto line = fit_line(points);
  REQUIRE(line);
  CHECK(line->slope == doctest::Approx(0.25).epsilon(1e-15));
  CHECK(line->at(0x1p40) == doctest::Approx(3 + 0x1p38).epsilon(1e-15));
  CHECK(line->chi2 < 1e-6);
}

TEST_CASE("weights count like repeated points") {
  const std::vector<LinePoint> weighted{{1, 2, 3}, {2, 5, 1}, {4, 6, 2}};
  const std::vector<LinePoint> repeated{{1, 2}, {1, 2}, {1, 2}, {2, 5}, {4, 6}, {4, 6}};
  const auto first = fit_line(weighted);
  const auto second = fit_line(repeated);
  REQUIRE(first);
  REQUIRE(second);
  CHECK(first->slope == doctest::Approx(second->slope).epsilon(1e-14));
  CHECK(first->intercept == doctest::Approx(second->intercept).epsilon(1e-14));
  CHECK(first->covariance == doctest::Approx(second->covariance).epsilon(1e-14));
  CHECK(first->chi2 == doctest::Approx(second->chi2).epsilon(1e-14));
  CHECK(first->degrees_of_freedom == 1);
  CHECK(second->degrees_of_freedom == 4);
}

TEST_CASE("the linear model agrees with the line and its covariance") {
  const std::vector<LinePoint> points{{1, 2, 3}, {2, 5, 1}, {4, 6, 2}, {7, 9, 0.5}};
  const auto line = fit_line(points);
  const auto model = fit_polynomial(points, 1);
  REQUIRE(line);
  REQUIRE(model);
  CHECK(model->coefficients[0] == doctest::Approx(line->intercept).epsilon(1e-13));
  CHECK(model->coefficients[1] == doctest::Approx(line->slope).epsilon(1e-13));
  CHECK(model->covariance(0, 0) == doctest::Approx(line->intercept_variance).epsilon(1e-13));
  CHECK(model->covariance(0, 1) == doctest::Approx(line->covariance).epsilon(1e-13));
  CHECK(model->covariance(1, 1) == doctest::Approx(line->slope_variance).epsilon(1e-13));
  CHECK(model->chi2 == doctest::Approx(line->chi2).epsilon(1e-12));
}

TEST_CASE("a fit that cannot be made says which point or what is missing") {
  const auto one = fit_line(std::vector<LinePoint>{{1, 1}});
  REQUIRE_FALSE(one);
  CHECK(mentions(one.error(), "found 1 points, expected at least 2"));
  const auto equal = fit_line(std::vector<LinePoint>{{0.1, 1}, {0.1, 2}, {0.1, 3}});
  REQUIRE_FALSE(equal);
  CHECK(mentions(equal.error(), "one abscissa, 0.1"));
  const auto broken = fit_line(std::vector<LinePoint>{{1, 1}, {2, kNan}});
  REQUIRE_FALSE(broken);
  CHECK(mentions(broken.error(), "point 2: found (2, nan)"));
  const auto weightless = fit_line_through_origin(std::vector<LinePoint>{{1, 1, 0}});
  REQUIRE_FALSE(weightless);
  CHECK(mentions(weightless.error(), "point 1: found weight 0"));
  CHECK_FALSE(fit_line_through_origin(std::vector<LinePoint>{{0, 1}}));
  const auto exact = fit_line(std::vector<LinePoint>{{0, 1}, {1, 2}});
  REQUIRE(exact);
  CHECK_FALSE(scaled_by_residuals(*exact));
}

TEST_CASE("regressors that depend on each other are refused whatever their units") {
  Matrix regressors(4, 3);
  for (int row = 0; row < 4; ++row) {
    regressors(row, 0) = 1;
    regressors(row, 1) = 1e-9 * row;
    regressors(row, 2) = 1e12 * (2 + 3 * row);
  }
  const std::vector<double> y{1, 2, 3, 5};
  const auto dependent = fit_linear_model(regressors, y);
  REQUIRE_FALSE(dependent);
  CHECK(mentions(dependent.error(), "rank 2"));
  CHECK_FALSE(fit_linear_model(regressors, std::vector<double>{1, 2}));
  CHECK_FALSE(fit_polynomial(std::vector<LinePoint>{{1, 1}, {2, 2}}, 2));
  regressors(3, 1) = 1e-9 * 7;  // no longer dependent, though the columns differ in size by 1e21
  CHECK(fit_linear_model(regressors, y));
}
