#include "model/spatial_parts.h"

#include <doctest/doctest.h>

#include <cmath>
#include <random>
#include <vector>

#include "model/moments.h"

using namespace evenfield;

namespace {

double normal(std::mt19937_64& engine) {
  double sum = -6;  // twelve uniform numbers make a normal one
  for (int i = 0; i < 12; ++i) sum += static_cast<double>(engine() >> 11) * 0x1p-53;
  return sum;
}

/// Population variance of `values`.
double population(const std::vector<double>& values) {
  Moments moments;
  for (const double value : values) moments.add(value);
  return *moments.variance() * (1 - 1 / static_cast<double>(values.size()));
}

struct Pattern {
  double row = 0, column = 0, pixel = 0, temporal_left = 0;  // standard deviations
};

LineVariances made_up(const Pattern& pattern,
                      std::size_t rows,
                      std::size_t columns,
                      std::mt19937_64& engine) {
  std::vector<double> all, of_rows(rows), of_columns(columns), column_part(columns);
  for (double& part : column_part) part = pattern.column * normal(engine);
  for (std::size_t y = 0; y < rows; ++y) {
    const double row_part = pattern.row * normal(engine);
    for (std::size_t x = 0; x < columns; ++x) {
      const double value =
          row_part + column_part[x] + pattern.pixel * normal(engine) + pattern.temporal_left * normal(engine);
      all.push_back(value);
      of_rows[y] += value / static_cast<double>(columns);
      of_columns[x] += value / static_cast<double>(rows);
    }
  }
  return {population(all), population(of_columns), population(of_rows), static_cast<double>(rows),
          static_cast<double>(columns)};
}

}  // namespace

TEST_CASE("the parts are without bias and scatter as said") {
  struct Row {
    Pattern pattern;
    std::size_t rows, columns;
  };
  const Row table[] = {{{1, 0.5, 2, 1}, 12, 9}, {{0, 0, 1, 0.5}, 5, 30}, {{3, 1, 0, 0.2}, 7, 7}};
  for (const Row& row : table) {
    CAPTURE(row.rows);
    std::mt19937_64 engine(11);
    const Pattern& pattern = row.pattern;
    const double left = pattern.temporal_left * pattern.temporal_left;
    Moments rows, columns, pixels, row_variance, column_variance, pixel_variance;
    constexpr int kRuns = 4000;
    for (int run = 0; run < kRuns; ++run) {
      const LineVariances variances = made_up(pattern, row.rows, row.columns, engine);
      const auto parts = spatial_parts(variances, left);
      const auto scatter = spatial_part_variances(variances, left, 0);
      REQUIRE(parts);
      REQUIRE(scatter);
      rows.add(parts->row);
      columns.add(parts->column);
      pixels.add(parts->pixel);
      row_variance.add(scatter->row.variance);
      column_variance.add(scatter->column.variance);
      pixel_variance.add(scatter->pixel.variance);
    }
    const auto unbiased = [&](const Moments& part, double truth) {
      CHECK(std::abs(*part.mean() - truth) < 4 * std::sqrt(*part.variance() / kRuns));
    };
    unbiased(rows, pattern.row * pattern.row);
    unbiased(columns, pattern.column * pattern.column);
    unbiased(pixels, pattern.pixel * pattern.pixel);
    // A mean square plugged into its own variance overstates it by 1 + 2/dof in the mean; sample variances of
    // 4000 skew numbers are known to 4 %.
    const auto scatters = [](const Moments& part, const Moments& said, double degrees) {
      CHECK(*said.mean() == doctest::Approx(*part.variance() * (1 + 2 / degrees)).epsilon(0.16));
    };
    const auto free_rows = static_cast<double>(row.rows - 1),
               free_columns = static_cast<double>(row.columns - 1);
    scatters(rows, row_variance, free_rows);
    scatters(columns, column_variance, free_columns);
    scatters(pixels, pixel_variance, free_rows * free_columns);
  }
}

TEST_CASE("the sampling variances are those of the closed form") {
  // M = 4, N = 5 of the worked image of METHODS 5.2: MS_row = 50/3, MS_col = 14, MS_res = 2/3. Row:
  // 2 (50/3)^2/3/25 + 2 (2/3)^2/12/25; column: 2 14^2/4/16 + 2 (2/3)^2/12/16; pixel 2 (2/3)^2/12 +
  // 2 0.1^2/(20 x 9).
  const LineVariances worked{5.7, 2.8, 2.5, 4, 5};
  const auto scatter = spatial_part_variances(worked, 0.1, 10);
  REQUIRE(scatter);
  CHECK(scatter->row.variance == doctest::Approx(2500.0 / 9 * 2 / 3 / 25 + 8.0 / 9 / 12 / 25).epsilon(1e-12));
  CHECK(scatter->column.variance == doctest::Approx(196.0 * 2 / 4 / 16 + 8.0 / 9 / 12 / 16).epsilon(1e-12));
  CHECK(scatter->pixel.variance == doctest::Approx(8.0 / 9 / 12 + 0.02 / 180).epsilon(1e-12));
  CHECK(scatter->row.degrees_of_freedom == 3);
  CHECK(scatter->column.degrees_of_freedom == 4);
  CHECK(scatter->pixel.degrees_of_freedom == 12);
}

TEST_CASE("parts of the system add up and agree with the mean squares on large images") {
  // Of 2000 x 3000 pixels with parts 4, 1, 9 and 0.5 left: S, C, R of the system's three equations.
  const double m = 2000, n = 3000, left = 0.5;
  const LineVariances variances{4 + 1 + 9 + left, 1 + (9 + left) / m, 4 + (9 + left) / n, m, n};
  const auto system = spatial_parts_by_system(variances, left);
  const auto parts = spatial_parts(variances, left);
  REQUIRE(system);
  REQUIRE(parts);
  CHECK(system->row == doctest::Approx(4).epsilon(1e-9));
  CHECK(system->column == doctest::Approx(1).epsilon(1e-9));
  CHECK(system->pixel == doctest::Approx(9).epsilon(1e-9));
  CHECK(parts->row == doctest::Approx(4).epsilon(1e-3));
  CHECK(parts->column == doctest::Approx(1).epsilon(1e-3));
  CHECK(parts->pixel == doctest::Approx(9).epsilon(1e-3));
}

TEST_CASE("exchanging rows and columns exchanges their parts, and parts below zero stay so") {
  const LineVariances one{1.0, 0.05, 0.30, 7, 11}, other{1.0, 0.30, 0.05, 11, 7};
  for (const auto split : {spatial_parts, spatial_parts_by_system}) {
    const auto a = split(one, 0.9), b = split(other, 0.9);
    REQUIRE(a);
    REQUIRE(b);
    CHECK(a->row == doctest::Approx(b->column).epsilon(1e-12));
    CHECK(a->column == doctest::Approx(b->row).epsilon(1e-12));
    CHECK(a->pixel == doctest::Approx(b->pixel).epsilon(1e-12));
    CHECK(a->column < 0);
    CHECK(a->pixel < 0);
  }
}

TEST_CASE("a single line has no parts") {
  const auto row = spatial_parts({1, 1, 0, 1, 50}, 0);
  REQUIRE_FALSE(row);
  CHECK(row.error().what == "parts of the pattern: found an image of 50 x 1 pixels, expected 2 x 2 or more");
  CHECK_FALSE(spatial_part_variances({1, 0, 1, 50, 1}, 0, 0));
  CHECK_FALSE(spatial_parts_by_system({1, 0.5, 0.5, 2, 2}, 0));
  CHECK(spatial_parts({1, 0.5, 0.5, 2, 2}, 0));
}
