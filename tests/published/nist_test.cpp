#include <doctest/doctest.h>

#include <cmath>
#include <fstream>
#include <sstream>
#include <string>
#include <vector>

#include "model/line_fit.h"
#include "model/moments.h"

// NIST Statistical Reference Data sets, certified values: itl.nist.gov/div898/strd. Data and values were seen
// via secondary texts and computed again from the data in 60-digit arithmetic. Digits that must agree:
// -log10(|x - c| / |c|), the loss that double precision allows less a margin.

using namespace evenfield;

namespace {

/// Rows of numbers of a data file, `#` lines left out.
std::vector<std::vector<double>> read_rows(const std::string& name) {
  std::ifstream file(std::string(EVENFIELD_SOURCE_DIR "/tests/published/nist/") + name);
  REQUIRE_MESSAGE(file.is_open(), name);
  std::vector<std::vector<double>> rows;
  for (std::string line; std::getline(file, line);) {
    if (line.starts_with('#')) continue;
    std::istringstream words(line);
    words.imbue(std::locale::classic());
    std::vector<double> row;
    for (double value = 0; words >> value;) row.push_back(value);
    rows.push_back(row);
  }
  return rows;
}

double matching_digits(double value, double certified) {
  return value == certified ? 17 : -std::log10(std::abs(value - certified) / std::abs(certified));
}

void check_digits(const char* what, double value, double certified, double digits) {
  CAPTURE(what);
  CAPTURE(value);
  CAPTURE(certified);
  CHECK(matching_digits(value, certified) >= digits);
}

std::vector<LinePoint> read_points(const std::string& name) {
  std::vector<LinePoint> points;
  for (const auto& row : read_rows(name)) points.push_back({row.at(1), row.at(0)});
  return points;
}

double deviation_of(const std::vector<double>& values) {
  Moments moments;
  for (const double value : values) moments.add(value);
  return std::sqrt(moments.variance().value());
}

}  // namespace

TEST_CASE("NUM-01: streaming moments keep the digits of data far from zero") {
  const auto alternating = [](double centre, double low, double high) {
    std::vector<double> values{centre};
    for (int i = 0; i < 500; ++i) values.insert(values.end(), {low, high});
    return values;
  };
  struct Row {
    const char* set;
    std::vector<double> values;
    double mean, deviation, digits;
  };
  const std::vector<Row> rows{
      {"NumAcc1", {10000001, 10000003, 10000002}, 10000002, 1, 15},
      {"NumAcc2", alternating(1.2, 1.1, 1.3), 1.2, 0.1, 13},
      {"NumAcc3", alternating(1000000.2, 1000000.1, 1000000.3), 1000000.2, 0.1, 9},
      {"NumAcc4", alternating(10000000.2, 10000000.1, 10000000.3), 10000000.2, 0.1, 7},
  };
  for (const Row& row : rows) {
    check_digits(row.set, deviation_of(row.values), row.deviation, row.digits);
    // In pieces of 37, merged: the same to the digits that the data allow.
    Moments whole;
    for (std::size_t start = 0; start < row.values.size(); start += 37) {
      Moments piece;
      for (std::size_t i = start; i < std::min(start + 37, row.values.size()); ++i) piece.add(row.values[i]);
      whole.merge(piece);
    }
    REQUIRE(whole.count() == row.values.size());
    check_digits(row.set, std::sqrt(whole.variance().value()), row.deviation, row.digits);
    check_digits(row.set, whole.mean().value(), row.mean, 14);
  }
}

TEST_CASE("NUM-02: mean, standard deviation and lag-one correlation of measured series") {
  struct Row {
    const char* file;
    double mean, deviation, correlation;
  };
  constexpr Row kRows[] = {
      {"mavro.txt", 2.00185600000000, 0.000429123454003053, 0.937989183438248},
      {"michelso.txt", 299.852400000000, 0.0790105478190518, 0.535199668621283},
      {"lew.txt", -177.435000000000, 277.332168044316, -0.307304800605679},
  };
  for (const Row& row : kRows) {
    std::vector<double> values;
    for (const auto& line : read_rows(row.file)) values.push_back(line.at(0));
    Moments moments;
    for (const double value : values) moments.add(value);
    check_digits(row.file, moments.mean().value(), row.mean, 14);
    check_digits(row.file, deviation_of(values), row.deviation, 12);
    check_digits(row.file, lag_one_correlation(values).value(), row.correlation, 12);
  }
}

TEST_CASE("NUM-03: the straight line of Norris") {
  const auto plain = fit_line(read_points("norris.txt"));
  REQUIRE(plain);
  const auto line = scaled_by_residuals(*plain);
  REQUIRE(line);
  check_digits("B0", line->intercept, -0.262323073774029, 11);
  check_digits("B1", line->slope, 1.00211681802045, 11);
  check_digits("sd B0", std::sqrt(line->intercept_variance), 0.232818234301152, 11);
  check_digits("sd B1", std::sqrt(line->slope_variance), 0.000429796848199937, 11);
  check_digits("residual sd", std::sqrt(line->chi2 / line->degrees_of_freedom), 0.884796396144373, 11);
  check_digits("RSS", line->chi2, 26.6173985294224, 11);
  check_digits("covariance", line->covariance, -7.74327536e-5, 8);  // printed to 9 digits
  check_digits("unscaled variance of B0", plain->intercept_variance, 6.92384428759429e-2, 11);
  check_digits("unscaled covariance", plain->covariance, -9.89095016390515e-5, 11);
  check_digits("unscaled variance of B1", plain->slope_variance, 2.35960747164148e-7, 11);
}

TEST_CASE("NUM-04: lines through the origin") {
  struct Row {
    const char* file;
    double slope, deviation, residual, squares;
  };
  constexpr Row kRows[] = {
      {"noint1.txt", 2.07438016528926, 0.0165289256198347, 3.56753034006338, 127.272727272727},
      {"noint2.txt", 0.727272727272727, 0.0420827318078432, 0.369274472937998, 0.272727272727273},
  };
  for (const Row& row : kRows) {
    const auto plain = fit_line_through_origin(read_points(row.file));
    REQUIRE(plain);
    const auto line = scaled_by_residuals(*plain);
    REQUIRE(line);
    check_digits(row.file, line->slope, row.slope, 13);
    check_digits(row.file, std::sqrt(line->slope_variance), row.deviation, 13);
    check_digits(row.file, std::sqrt(line->chi2 / line->degrees_of_freedom), row.residual, 13);
    check_digits(row.file, line->chi2, row.squares, 13);
  }
}

TEST_CASE("NUM-05: the parabola of Pontius") {
  const auto model = fit_polynomial(read_points("pontius.txt"), 2);
  REQUIRE(model);
  constexpr double kCoefficients[] = {0.673565789473684e-3, 0.732059160401003e-6, -0.316081871345029e-14};
  constexpr double kDeviations[] = {0.107938612033077e-3, 0.157817399981659e-9, 0.486652849992036e-16};
  for (int j = 0; j < 3; ++j) {
    CAPTURE(j);
    check_digits("coefficient", model->coefficients[static_cast<std::size_t>(j)], kCoefficients[j], 10);
    check_digits("its sd", model->scaled_uncertainty(j), kDeviations[j], 10);
  }
  check_digits("residual sd", std::sqrt(model->chi2 / model->degrees_of_freedom), 0.205177424076185e-3, 10);
  check_digits("RSS", model->chi2, 0.155761768796992e-5, 10);
}

TEST_CASE("NUM-06: the nearly dependent regressors of Longley") {
  const auto rows = read_rows("longley.txt");
  Matrix regressors(static_cast<int>(rows.size()), 7);
  std::vector<double> y;
  for (int row = 0; row < regressors.rows; ++row) {
    const auto& values = rows[static_cast<std::size_t>(row)];
    y.push_back(values.at(0));
    regressors(row, 0) = 1;
    for (int j = 1; j < 7; ++j) regressors(row, j) = values.at(static_cast<std::size_t>(j));
  }
  const auto model = fit_linear_model(regressors, y);
  REQUIRE(model);
  constexpr double kCoefficients[] = {-3482258.63459582, 15.0618722713733,  -0.0358191792925910,
                                      -2.02022980381683, -1.03322686717359, -0.0511041056535807,
                                      1829.15146461355};
  constexpr double kDeviations[] = {890420.383607373,  84.9149257747669,  0.0334910077722432,
                                    0.488399681651699, 0.214274163161675, 0.226073200069370,
                                    455.478499142212};
  for (int j = 0; j < 7; ++j) {
    CAPTURE(j);
    check_digits("coefficient", model->coefficients[static_cast<std::size_t>(j)], kCoefficients[j], 9);
    check_digits("its sd", model->scaled_uncertainty(j), kDeviations[j], 9);
  }
  check_digits("residual sd", std::sqrt(model->chi2 / model->degrees_of_freedom), 304.854073561965, 9);
  check_digits("RSS", model->chi2, 836424.055505915, 9);
}
