#include <array>
#include <cmath>
#include <vector>

#include "check_row.h"
#include "model/gum.h"
#include "model/line_fit.h"
#include "model/student.h"

using namespace evenfield;

TEST_CASE("resistance, reactance and impedance of GUM H.2 with their correlations") {
  constexpr double kVolt[] = {5.007, 4.994, 5.005, 4.990, 4.999};
  constexpr double kMilliampere[] = {19.663, 19.639, 19.640, 19.685, 19.678};
  constexpr double kRadian[] = {1.0456, 1.0438, 1.0468, 1.0428, 1.0433};
  Matrix observed(5, 3);
  double v = 0, i = 0, phi = 0;
  for (int row = 0; row < 5; ++row) {
    observed(row, 0) = kVolt[row];
    observed(row, 1) = kMilliampere[row] * 1e-3;
    observed(row, 2) = kRadian[row];
    v += observed(row, 0) / 5;
    i += observed(row, 1) / 5;
    phi += observed(row, 2) / 5;
  }
  const auto inputs = covariance_of_means(observed);
  REQUIRE(inputs);
  const Matrix input_correlation = correlation_of(*inputs);
  Matrix jacobian(3, 3);  // of R = V cos(phi) / I, X = V sin(phi) / I, Z = V / I
  const double r = v * std::cos(phi) / i, x = v * std::sin(phi) / i, z = v / i;
  jacobian.values = {r / v, -r / i, -x, x / v, -x / i, r, z / v, -z / i, 0};
  const auto outputs = propagate(jacobian, *inputs);
  REQUIRE(outputs);
  const Matrix correlation = correlation_of(*outputs);
  Matrix independent(3, 3);
  for (int input = 0; input < 3; ++input) independent(input, input) = (*inputs)(input, input);
  const auto ignored = propagate(jacobian, independent);
  REQUIRE(ignored);
  constexpr const char* kInputs = "JCGM 100:2008 H.2, means and correlations";
  constexpr const char* kResults = "JCGM 100:2008 H.2, printed results";
  constexpr const char* kDigits = "full precision from the same data";
  const std::array rows{
      CheckRow{"GU-01", "u(V)", std::sqrt((*inputs)(0, 0)), 0.0032, 1e-4, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "u(I)", std::sqrt((*inputs)(1, 1)), 0.0095e-3, 1e-7, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "u(phi)", std::sqrt((*inputs)(2, 2)), 0.00075, 1e-5, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "r(V, I)", input_correlation(0, 1), -0.36, 0.01, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "r(V, phi)", input_correlation(0, 2), 0.86, 0.01, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "r(I, phi)", input_correlation(1, 2), -0.65, 0.01, Mark::via_secondary, kInputs},
      CheckRow{"GU-01", "u(R)", std::sqrt((*outputs)(0, 0)), 0.071, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "u(X)", std::sqrt((*outputs)(1, 1)), 0.295, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "u(Z)", std::sqrt((*outputs)(2, 2)), 0.236, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "r(R, X)", correlation(0, 1), -0.588, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "r(R, Z)", correlation(0, 2), -0.485, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "r(X, Z)", correlation(1, 2), 0.993, 1e-3, Mark::reproduced, kResults},
      CheckRow{"GU-01", "u(R), digits", std::sqrt((*outputs)(0, 0)), 0.07107141, 1e-8, Mark::derived,
               kDigits},
      CheckRow{"GU-01", "u(X), digits", std::sqrt((*outputs)(1, 1)), 0.29558168, 1e-8, Mark::derived,
               kDigits},
      CheckRow{"GU-01", "u(Z), digits", std::sqrt((*outputs)(2, 2)), 0.23633613, 1e-8, Mark::derived,
               kDigits},
      CheckRow{"GU-01", "r(R, X), digits", correlation(0, 1), -0.58842978, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-01", "r(R, Z), digits", correlation(0, 2), -0.48525922, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-01", "r(X, Z), digits", correlation(1, 2), 0.99251165, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-01", "u(R) without correlations", std::sqrt((*ignored)(0, 0)), 0.19454, 1e-5,
               Mark::derived, kDigits},
  };
  check_rows(rows);
}

TEST_CASE("the calibration line of GUM H.3 and its prediction") {
  constexpr double kReading[] = {21.521, 22.012, 22.512, 23.003, 23.507, 23.999,
                                 24.513, 25.002, 25.503, 26.010, 26.511};
  constexpr double kCorrection[] = {-.171, -.169, -.166, -.159, -.164, -.165,
                                    -.156, -.157, -.159, -.161, -.160};
  std::vector<LinePoint> points;
  for (std::size_t k = 0; k < std::size(kReading); ++k) points.push_back({kReading[k] - 20, kCorrection[k]});
  const auto plain = fit_line(points);
  REQUIRE(plain);
  const auto line = scaled_by_residuals(*plain);
  REQUIRE(line);
  const double scatter = std::sqrt(line->chi2 / line->degrees_of_freedom);
  constexpr const char* kPrinted = "JCGM 100:2008 H.3, printed results";
  constexpr const char* kDigits = "full precision from the same data";
  const std::array rows{
      CheckRow{"GU-02", "y1", line->intercept, -0.1712, 1e-4, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "u(y1)", std::sqrt(line->intercept_variance), 0.0029, 1e-4, Mark::reproduced,
               kPrinted},
      CheckRow{"GU-02", "y2", line->slope, 0.00218, 1e-5, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "u(y2)", std::sqrt(line->slope_variance), 0.00067, 1e-5, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "r(y1, y2)", line->correlation(), -0.930, 1e-3, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "s", scatter, 0.0035, 1e-4, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "correction at 30", line->at(10), -0.1494, 1e-4, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "its u", std::sqrt(line->variance_at(10)), 0.0041, 1e-4, Mark::reproduced, kPrinted},
      CheckRow{"GU-02", "y1, digits", line->intercept, -0.17120379, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-02", "y2, digits", line->slope, 0.0021827, 1e-7, Mark::derived, kDigits},
      CheckRow{"GU-02", "u(y1), digits", std::sqrt(line->intercept_variance), 0.0028776, 1e-7, Mark::derived,
               kDigits},
      CheckRow{"GU-02", "u(y2), digits", std::sqrt(line->slope_variance), 0.00066794, 1e-8, Mark::derived,
               kDigits},
      CheckRow{"GU-02", "r, digits", line->correlation(), -0.9304296, 1e-7, Mark::derived, kDigits},
      CheckRow{"GU-02", "s, digits", scatter, 0.00349756, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-02", "at 30, digits", line->at(10), -0.14937681, 1e-8, Mark::derived, kDigits},
      CheckRow{"GU-02", "its u, digits", std::sqrt(line->variance_at(10)), 0.00413860, 1e-8, Mark::derived,
               kDigits},
  };
  check_rows(rows);
}

TEST_CASE("coverage factors, effective degrees of freedom and intervals of a standard deviation") {
  constexpr double kCoverage = 0.9545;
  constexpr const char* kTable = "JCGM 100:2008 table G.2";
  const std::array<Contribution, 4> gauge{Contribution{25, 18}, Contribution{9.7, 25.6},
                                          Contribution{2.9, 50}, Contribution{16.6, 2}};
  const auto [low, high] = deviation_interval_factors(0.95, 9);
  const std::array rows{
      CheckRow{"GU-03", "k, nu = 1", coverage_factor(kCoverage, 1), 13.97, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, nu = 2", coverage_factor(kCoverage, 2), 4.53, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, nu = 5", coverage_factor(kCoverage, 5), 2.65, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, nu = 10", coverage_factor(kCoverage, 10), 2.28, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, nu = 20", coverage_factor(kCoverage, 20), 2.13, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, nu = 50", coverage_factor(kCoverage, 50), 2.05, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-03", "k, normal", coverage_factor(kCoverage, {}), 2.00, 0.005, Mark::reproduced, kTable},
      CheckRow{"GU-04", "effective degrees of freedom", effective_degrees_of_freedom(gauge), 16.7, 0.1,
               Mark::reproduced, "JCGM 100:2008 H.1"},
      CheckRow{"GU-04", "combined u [nm]", combined_uncertainty(gauge), 31.7, 0.1, Mark::derived,
               "sqrt(25^2 + 9.7^2 + 2.9^2 + 16.6^2)"},
      CheckRow{"GU-03", "sigma / S, low, nu = 9", low, 0.68784, 5e-6, Mark::derived, "chi square quantiles"},
      CheckRow{"GU-03", "sigma / S, high, nu = 9", high, 1.82561, 5e-6, Mark::derived,
               "chi square quantiles"},
  };
  check_rows(rows);
}
