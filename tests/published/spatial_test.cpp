#include "model/spatial.h"

#include <array>
#include <vector>

#include "check_row.h"
#include "model/high_pass.h"
#include "model/spatial_parts.h"
#include "model/spectrum.h"
#include "model/value_histogram.h"

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

TEST_CASE("rows, columns and pixels of the worked image by both forms") {
  // 100 + row + column + pixel parts, 4 rows of 5; population variances by their definition.
  constexpr double kRow[] = {1, -1, 2, -2}, kColumn[] = {3, -1, 0, -2, 0};
  constexpr double kPixel[4][5] = {{1, -1, 0, 0, 0}, {-1, 1, 0, 0, 0}, {0, 0, 1, -1, 0}, {0, 0, -1, 1, 0}};
  LineVariances found{0, 0, 0, 4, 5};
  double row_means[4] = {}, column_means[5] = {};
  for (int y = 0; y < 4; ++y)
    for (int x = 0; x < 5; ++x) {
      const double value = 100 + kRow[y] + kColumn[x] + kPixel[y][x];
      found.all += (value - 100) * (value - 100) / 20;
      row_means[y] += value / 5;
      column_means[x] += value / 4;
    }
  for (const double mean : row_means) found.of_rows += (mean - 100) * (mean - 100) / 4;
  for (const double mean : column_means) found.of_columns += (mean - 100) * (mean - 100) / 5;
  const auto system = spatial_parts_by_system(found, 0);
  const auto parts = spatial_parts(found, 0);
  REQUIRE(system);
  REQUIRE(parts);
  constexpr const char* kSystem = "linear system of EMVA 1288 R4.0 (from memory), arithmetic";
  constexpr const char* kEffects = "two-way random effects, mean squares 50/3, 14, 2/3";
  const std::array rows{
      CheckRow{"SP-02", "S", found.all, 5.7, 1e-12, Mark::derived, kSystem},
      CheckRow{"SP-02", "C", found.of_columns, 2.8, 1e-12, Mark::derived, kSystem},
      CheckRow{"SP-02", "R", found.of_rows, 2.5, 1e-12, Mark::derived, kSystem},
      CheckRow{"SP-02", "pixel", system->pixel, 0.72727273, 1e-8, Mark::derived, kSystem},
      CheckRow{"SP-02", "column", system->column, 2.61818182, 1e-8, Mark::derived, kSystem},
      CheckRow{"SP-02", "row", system->row, 2.35454545, 1e-8, Mark::derived, kSystem},
      CheckRow{"SP-02", "sum", system->pixel + system->column + system->row, 5.7, 1e-12, Mark::derived,
               kSystem},
      CheckRow{"SP-03", "pixel", parts->pixel, 2.0 / 3, 1e-12, Mark::derived, kEffects},
      CheckRow{"SP-03", "column", parts->column, 10.0 / 3, 1e-12, Mark::derived, kEffects},
      CheckRow{"SP-03", "row", parts->row, 3.2, 1e-12, Mark::derived, kEffects},
  };
  check_rows(rows);
}

TEST_CASE("the high-pass of the standard passes the shares of noise and of lines that its kernel says") {
  const BoxChain chain, single{{5}};
  // Along one axis the centre is 1/11, because the other boxes together are narrower than 11, and the sum of
  // squares 0.0708804183.
  constexpr const char* kKernel = "kernel of EMVA 1288 R3.1 (from memory); 1 - 2 h0 + sum h^2";
  const std::array rows{
      CheckRow{"SP-05", "border [pixels]", static_cast<double>(chain.border()), 9, 0, Mark::from_memory,
               kKernel},
      CheckRow{"SP-05", "variance of white noise", white_noise_gain(chain), 0.9884951081, 1e-9, Mark::derived,
               kKernel},
      CheckRow{"SP-05", "its root", std::sqrt(white_noise_gain(chain)), 0.9942309, 1e-7, Mark::derived,
               kKernel},
      CheckRow{"SP-05", "variance of columns or rows", line_pattern_gain(chain), 0.8890622, 1e-7,
               Mark::derived, kKernel},
      CheckRow{"SP-05", "a single box of 5 x 5", white_noise_gain(single), 0.96, 1e-12, Mark::derived,
               "1 - 1/25"},
  };
  check_rows(rows);
}

TEST_CASE("the spectrogram of a row of eight") {
  const std::vector<float> row{1, 3, 2, 6, 4, 2, 0, 2};
  const auto spectrum = line_spectrum(row, 8, 1, LineDirection::rows);
  REQUIRE(spectrum);
  REQUIRE(spectrum->power.size() == 5);
  constexpr const char* kSource = "spectrograms of EMVA 1288 (from memory), arithmetic";
  const std::array rows{
      CheckRow{"SP-06", "p[0]", spectrum->power[0], 0, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-06", "p[1]", spectrum->power[1], 7.1087572, 1e-6, Mark::derived, kSource},
      CheckRow{"SP-06", "p[2]", spectrum->power[2], 2.25, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-06", "p[3]", spectrum->power[3], 0.391243, 1e-6, Mark::derived, kSource},
      CheckRow{"SP-06", "p[4]", spectrum->power[4], 4.5, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-06", "mean of p", spectrum_variance(*spectrum), 3.0, 1e-12, Mark::derived, kSource},
  };
  check_rows(rows);
}

TEST_CASE("the bins of a histogram of means") {
  const ValueBins bins = bins_of_means(10, 90, 16);
  constexpr const char* kSource = "rule of EMVA 1288, from memory; arithmetic derived";
  const std::array rows{
      CheckRow{"SP-07", "I, multiples a bin", bins.width * 16, 6, 0, Mark::derived, kSource},
      CheckRow{"SP-07", "Q, bins", static_cast<double>(bins.count), 214, 0, Mark::derived, kSource},
      CheckRow{"SP-07", "centre of the first", bins.first, 10 + 5.0 / 32, 1e-12, Mark::derived, kSource},
      CheckRow{"SP-07", "centre of the last", bins.centre(213), 10 + 5.0 / 32 + 213 * 6.0 / 16, 1e-12,
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
