#include "model/spectrum.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>
#include <random>
#include <vector>

#include "numbered_image.h"

using namespace evenfield;

namespace {

std::vector<float> white_noise(std::size_t pixels, double sigma, std::uint64_t seed) {
  std::mt19937_64 engine(seed);
  std::vector<float> out(pixels);
  for (float& value : out) {
    double sum = -6;  // twelve uniform numbers make a normal one
    for (int i = 0; i < 12; ++i) sum += static_cast<double>(engine() >> 11) * 0x1p-53;
    value = static_cast<float>(sigma * sum);
  }
  return out;
}

double population_variance(const std::vector<float>& image) {
  double mean = 0, variance = 0;
  for (const float value : image) mean += static_cast<double>(value) / static_cast<double>(image.size());
  for (const float value : image)
    variance += std::pow(static_cast<double>(value) - mean, 2) / static_cast<double>(image.size());
  return variance;
}

}  // namespace

TEST_CASE("the spectrum agrees with an outside program in both directions") {
  struct Row {
    int width, height;
    LineDirection direction;
    double first, second, last, median, variance;
  };
  // NumPy 1.24: mean over lines of |fft(image - mean)|^2 / N in double precision; lengths 13, 6, 58, 37.
  constexpr Row kRows[] = {
      {13, 6, LineDirection::rows, 449763.3525641025, 289252.3995282461, 23396.06421002382, 39217.17038865539,
       117627.97583826429},
      {13, 6, LineDirection::columns, 304425.201183432, 96732.78205128203, 73362.24358974358,
       73362.24358974358, 117627.97583826429},
      {58, 37, LineDirection::rows, 111054.81395934611, 103966.73897889082, 40073.90773532151,
       84183.15539760531, 88760.37125009445},
      {58, 37, LineDirection::columns, 84307.48555452004, 118684.23729856714, 90527.77905561886,
       86838.6036411043, 88760.37125009445},
  };
  for (const Row& row : kRows) {
    CAPTURE(row.width);
    const auto spectrum =
        line_spectrum(numbered_image(row.width, row.height), row.width, row.height, row.direction);
    REQUIRE(spectrum);
    const bool rows = row.direction == LineDirection::rows;
    CHECK(spectrum->length == (rows ? row.width : row.height));
    CHECK(spectrum->lines == (rows ? row.height : row.width));
    REQUIRE(spectrum->power.size() == static_cast<std::size_t>(spectrum->length / 2 + 1));
    CHECK(spectrum->power.front() == doctest::Approx(row.first).epsilon(1e-11));
    CHECK(spectrum->power[1] == doctest::Approx(row.second).epsilon(1e-11));
    CHECK(spectrum->power.back() == doctest::Approx(row.last).epsilon(1e-11));
    CHECK(white_part(*spectrum) == doctest::Approx(row.median).epsilon(1e-11));
    CHECK(spectrum_variance(*spectrum) == doctest::Approx(row.variance).epsilon(1e-11));
  }
}

TEST_CASE("any length of lines obeys the definition and keeps the variance") {
  // Ones and twos, products of small factors, and primes, which are transformed as a convolution.
  for (const int length : {1, 2, 3, 23, 29, 64, 101, 257, 2 * 251, 1009}) {
    CAPTURE(length);
    const int lines = 5;
    const std::vector<float> image = numbered_image(length, lines);
    const auto spectrum = line_spectrum(image, length, lines, LineDirection::rows);
    REQUIRE(spectrum);
    const double variance = population_variance(image);
    CHECK(spectrum_variance(*spectrum) == doctest::Approx(variance).epsilon(1e-11));
    double mean = 0;
    for (const float value : image) mean += static_cast<double>(value) / static_cast<double>(image.size());
    for (const int v : {0, length / 3, length / 2}) {
      double power = 0;
      for (int m = 0; m < lines; ++m) {
        double real = 0, imaginary = 0;
        for (int n = 0; n < length; ++n) {
          const double angle = 2 * std::numbers::pi * (v * n % length) / length;
          const double value = static_cast<double>(image[static_cast<std::size_t>(m * length + n)]) - mean;
          real += value * std::cos(angle);
          imaginary -= value * std::sin(angle);
        }
        power += (real * real + imaginary * imaginary) / length / lines;
      }
      CAPTURE(v);
      CHECK(std::abs(spectrum->power[static_cast<std::size_t>(v)] - power) < 1e-9 * variance);
    }
  }
}

TEST_CASE("a sine stands at its frequency and leaves the white part alone") {
  // Amplitude a at v gives p[v] = a^2 N/4 above the noise; variance sigma^2 + a^2/2.
  const int width = 480, height = 300, v = 60;
  const double sigma = 2, amplitude = 1;
  std::vector<float> image = white_noise(static_cast<std::size_t>(width * height), sigma, 3);
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x)
      image[static_cast<std::size_t>(y * width + x)] +=
          static_cast<float>(amplitude * std::cos(2 * std::numbers::pi * v * x / width + y));
  const auto rows = line_spectrum(image, width, height, LineDirection::rows);
  REQUIRE(rows);
  // p[v] scatters by sqrt(sigma^4 + 2 sigma^2 a^2 N/4) / sqrt(300) = 1.8; the median of 240 values that
  // scatter by 4/sqrt(300) each by 1.25/sqrt(240) of that: 0.019.
  CHECK(std::abs(rows->power[v] - (4 + 120)) < 4 * 1.8);
  CHECK(std::abs(white_part(*rows) - 4) < 4 * 0.019);
  CHECK(non_whiteness(*rows) == doctest::Approx(4.5 / 4).epsilon(0.03));
  // Temporal noise off: of the same white noise a quarter is left.
  const Spectrum pattern = without_noise(*rows, 3);
  CHECK(white_part(pattern) == doctest::Approx(white_part(*rows) - 3));
  CHECK(spectrum_variance(pattern) == doctest::Approx(spectrum_variance(*rows) - 3));
}

TEST_CASE("white noise is white and has no factor where nothing is white") {
  const std::vector<float> image = white_noise(200 * 301, 5, 4);
  for (const LineDirection direction : {LineDirection::rows, LineDirection::columns}) {
    const auto spectrum = line_spectrum(image, 200, 301, direction);
    REQUIRE(spectrum);
    // Median of 100 and 150 values that scatter by 1/sqrt(301) and 1/sqrt(200): 0.7 %; variance 0.6 %.
    CHECK(std::abs(non_whiteness(*spectrum) - 1) < 4 * 0.01);
  }
  const std::vector<float> even(100, 7.5F);
  const auto nothing = line_spectrum(even, 10, 10, LineDirection::rows);
  REQUIRE(nothing);
  CHECK(spectrum_variance(*nothing) == 0);
  CHECK(std::isnan(non_whiteness(*nothing)));
}

TEST_CASE("transposing an image exchanges its spectra") {
  const int width = 37, height = 58;
  const std::vector<float> image = numbered_image(width, height);
  std::vector<float> transposed(image.size());
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x)
      transposed[static_cast<std::size_t>(x * height + y)] = image[static_cast<std::size_t>(y * width + x)];
  const auto columns = line_spectrum(image, width, height, LineDirection::columns);
  const auto rows = line_spectrum(transposed, height, width, LineDirection::rows);
  REQUIRE(columns);
  REQUIRE(rows);
  REQUIRE(columns->power.size() == rows->power.size());
  for (std::size_t v = 0; v < rows->power.size(); ++v)
    CHECK(columns->power[v] == doctest::Approx(rows->power[v]).epsilon(1e-11));
}

TEST_CASE("the spectrum gives the same bits for any number of threads") {
  for (const int width : {128, 131}) {
    const auto image = numbered_image(width, 333);
    const auto alone = line_spectrum(image, width, 333, LineDirection::rows, 1);
    const auto shared = line_spectrum(image, width, 333, LineDirection::rows, 5);
    REQUIRE(alone);
    REQUIRE(shared);
    CHECK(alone->power == shared->power);
  }
}

TEST_CASE("an image without pixels has no spectrum") {
  const auto none = line_spectrum({}, 0, 5, LineDirection::rows);
  REQUIRE_FALSE(none);
  CHECK(none.error().what == "spectrum: found an image of 0 x 5 pixels, expected one or more");
}
