#include "model/high_pass.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <random>
#include <utility>
#include <vector>

#include "numbered_image.h"

using namespace evenfield;

namespace {

/// Pixel (x, y) of the interior by the definition: the pixel less the weighted sum around it.
double direct(const std::vector<float>& image, int width, int x, int y, const BoxChain& chain) {
  const std::vector<double> kernel = low_pass_kernel(chain);
  const auto at = [&](std::size_t row, std::size_t column) {
    return static_cast<double>(image[(static_cast<std::size_t>(y) + row) * static_cast<std::size_t>(width) +
                                     static_cast<std::size_t>(x) + column]);
  };
  double low = 0;
  for (std::size_t j = 0; j < kernel.size(); ++j)
    for (std::size_t i = 0; i < kernel.size(); ++i) low += kernel[j] * kernel[i] * at(j, i);
  return at(kernel.size() / 2, kernel.size() / 2) - low;
}

double at(const HighPassImage& image, int x, int y) {
  return static_cast<double>(
      image.values[static_cast<std::size_t>(y) * static_cast<std::size_t>(image.width) +
                   static_cast<std::size_t>(x)]);
}

struct Spread {
  double mean = 0, variance = 0;
};
Spread spread_of(std::span<const float> values) {
  Spread out;
  for (const float value : values)
    out.mean += static_cast<double>(value) / static_cast<double>(values.size());
  for (const float value : values)
    out.variance += std::pow(static_cast<double>(value) - out.mean, 2) / static_cast<double>(values.size());
  return out;
}

}  // namespace

TEST_CASE("the filter agrees with an outside program on a small image") {
  // SciPy 1.10, image of 53 x 40: uniform_filter 7, uniform_filter 11, convolve1d (1 2 1)/4 along both axes,
  // in double precision, interior [9:-9, 9:-9] of image - low-pass.
  const auto filtered = high_pass(numbered_image(53, 40), 53, 40);
  REQUIRE(filtered);
  REQUIRE(filtered->width == 35);
  REQUIRE(filtered->height == 22);
  CHECK(filtered->border == 9);
  // A float of some hundreds is rounded by up to 3e-5.
  CHECK(std::abs(at(*filtered, 0, 0) - -229.16927390791034) < 3e-5);
  CHECK(std::abs(at(*filtered, 20, 10) - 143.81313248439875) < 3e-5);
  CHECK(std::abs(at(*filtered, 34, 21) - 450.18052158880096) < 3e-5);
  const Spread spread = spread_of(filtered->view());
  CHECK(spread.mean == doctest::Approx(6.297243695965048).epsilon(1e-6));
  CHECK(spread.variance == doctest::Approx(84477.21757598467).epsilon(1e-6));
}

TEST_CASE("the filter is the weighted sum around each pixel across the seams of its tiles") {
  // Tiles are 512 columns and 256 rows of the result.
  const int width = 18 + 512 + 37, height = 18 + 256 + 5;
  const std::vector<float> image = numbered_image(width, height);
  for (const BoxChain& chain :
       {BoxChain{}, BoxChain{{5}}, BoxChain{{2, 2}}, BoxChain{{1}}, BoxChain{{3, 19, 4, 4}}}) {
    CAPTURE(chain.border());
    const auto filtered = high_pass(image, width, height, chain);
    REQUIRE(filtered);
    double largest = 0;
    for (int y = 0; y < filtered->height; y += y < 240 ? 16 : 1)
      for (int x = 0; x < filtered->width; x += x < 500 ? 50 : 1)
        largest = std::max(largest, std::abs(at(*filtered, x, y) - direct(image, width, x, y, chain)));
    CHECK(largest < 6.2e-5);  // half a unit of the last place of a float of 512 to 1024 is 3.1e-5
  }
}

TEST_CASE("planes vanish and far levels leave no rounding of sums") {
  // Symmetric kernels pass any plane. These pixels are whole numbers, so that only sums could be rounded: in
  // single precision by 0.004.
  const int width = 1100, height = 600;
  std::vector<float> image;
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x) image.push_back(static_cast<float>(50000 + 8 * x - 4 * y));
  const auto filtered = high_pass(image, width, height);
  REQUIRE(filtered);
  double largest = 0;
  for (const float value : filtered->view())
    largest = std::max(largest, std::abs(static_cast<double>(value)));
  CHECK(largest < 1e-8);
}

TEST_CASE("white noise, columns and rows keep the variance that the kernel says") {
  const int size = 1018;  // a million pixels of interior
  std::mt19937_64 engine(5);
  const auto uniform = [&] {
    return std::sqrt(12.0) * (static_cast<double>(engine() >> 11) * 0x1p-53 - 0.5);
  };
  std::vector<float> white;
  for (int i = 0; i < size * size; ++i) white.push_back(static_cast<float>(uniform()));
  const auto filtered = high_pass(white, size, size);
  REQUIRE(filtered);
  // Uniform numbers of variance 1: their sample variance scatters by sqrt(0.8 / n) = 0.0009.
  CHECK(std::abs(spread_of(filtered->view()).variance - white_noise_gain({})) < 4 * 0.0009);

  std::vector<float> columns(static_cast<std::size_t>(size * 100)), rows(columns.size());
  double gain_of_columns = 0;
  for (int run = 0; run < 20; ++run) {
    std::vector<float> line;
    for (int i = 0; i < size; ++i) line.push_back(static_cast<float>(uniform()));
    for (std::size_t y = 0; y < 100; ++y)
      for (std::size_t x = 0; x < static_cast<std::size_t>(size); ++x) {
        columns[y * static_cast<std::size_t>(size) + x] = line[x];
        rows[x * 100 + y] = line[x];
      }
    const auto of_columns = high_pass(columns, size, 100);
    const auto of_rows = high_pass(rows, 100, size);
    REQUIRE(of_columns);
    REQUIRE(of_rows);
    const double variance = spread_of(of_columns->view()).variance;
    CHECK(spread_of(of_rows->view()).variance == doctest::Approx(variance).epsilon(1e-6));
    gain_of_columns += variance / 20;
  }
  // 20000 numbers: 0.0063.
  CHECK(std::abs(gain_of_columns - line_pattern_gain({})) < 4 * 0.0063);
}

TEST_CASE("the filter gives the same bits for any number of threads") {
  const auto image = numbered_image(1200, 700);
  const auto alone = high_pass(image, 1200, 700, {}, 1);
  REQUIRE(alone);
  for (const int threads : {2, 3, 7}) {
    const auto shared = high_pass(image, 1200, 700, {}, threads);
    REQUIRE(shared);
    CHECK(std::ranges::equal(alone->view(), shared->view()));
  }
}

TEST_CASE("images smaller than the kernel and chains without a centre are refused") {
  CHECK(high_pass(numbered_image(19, 19), 19, 19)->pixels() == 1);
  const auto narrow = high_pass(numbered_image(18, 40), 18, 40);
  REQUIRE_FALSE(narrow);
  CHECK(narrow.error().what == "low-pass: found an image of 18 x 40 pixels, expected 19 x 19 or more");
  CHECK_FALSE(high_pass(numbered_image(40, 18), 40, 18));
  CHECK_FALSE(BoxChain{{}}.check());
  CHECK_FALSE(BoxChain{{7, 2}}.check());
  CHECK_FALSE(BoxChain{{7, 0}}.check());
  CHECK_FALSE(BoxChain{{9999, 9999, 9999}}.check());
  CHECK(BoxChain{{2, 2}}.check());
}
