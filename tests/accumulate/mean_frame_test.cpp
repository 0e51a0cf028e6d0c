#include "accumulate/mean_frame.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>
#include <cstring>
#include <limits>
#include <numeric>

#include "accumulate/raw_frames.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

/// Overlapping ones, one that begins and ends inside of bands, one of a single pixel.
std::vector<Rect> regions_of(int width, int height) {
  return {{0, 0, width, height},
          {3, 5, width / 2, height / 3},
          {width / 4, 7, width / 2, 2},
          {width - 1, height - 1, 1, 1}};
}

template <class T>
std::vector<double> samples(const RawFrames<T>& raw, const Rect& rect, int x, int y) {
  std::vector<double> out;
  for (const auto& frame : raw.frames())
    out.push_back(
        static_cast<double>(frame[static_cast<std::size_t>((rect.y + y) * raw.shape().width + rect.x + x)]));
  return out;
}

/// The means from their definition. Integers up to 2^32 add exactly in a double.
template <class T>
void check_means(const RawFrames<T>& raw, const std::vector<PixelMeans>& means) {
  for (const PixelMeans& region : means) {
    REQUIRE(region.frames == static_cast<int>(raw.frames().size()));
    for (int y = 0; y < region.rect.height; ++y)
      for (int x = 0; x < region.rect.width; ++x) {
        double sum = 0;
        for (const double sample : samples(raw, region.rect, x, y)) sum += sample - region.level_dn;
        const auto expected = static_cast<float>(sum / region.frames);
        REQUIRE(region.means()[static_cast<std::size_t>(y * region.rect.width + x)] == expected);
      }
  }
}

bool same_bits(std::span<const float> a, std::span<const float> b) {
  return a.size() == b.size() && std::memcmp(a.data(), b.data(), a.size_bytes()) == 0;
}

template <class T>
void check_type(double level, double spread) {
  boost::random::mt19937_64 random(5);
  boost::random::normal_distribution<double> noise(level, spread);
  // More columns than fit a band of two rows, and a height that bands do not divide.
  const int width = 3001;
  const int height = 41;
  const RawFrames<T> raw(width, height, make_frames<T>(width, height, 7, [&](int, int x, int y) {
                           const double value = noise(random) + (x % 11) + (y % 5);
                           return std::is_floating_point_v<T> ? value : std::round(value);
                         }));
  MeanFrameOptions options;
  const auto one = mean_frame(raw.stack(), regions_of(width, height), options);
  REQUIRE(one);
  check_means(raw, *one);
  CHECK((*one)[0].variances().empty());
}

}  // namespace

TEST_CASE("the mean frame is that of the definition, for every type of pixel") {
  check_type<std::uint8_t>(100, 20);
  check_type<std::int8_t>(0, 20);
  check_type<std::uint16_t>(40000, 150);
  check_type<std::int16_t>(-20000, 150);
  check_type<std::uint32_t>(4e9, 1000);
  check_type<std::int32_t>(-2e9, 1000);
  check_type<float>(0.5, 0.01);
  check_type<double>(1e6, 1e-3);
}

TEST_CASE("sums of the largest and smallest codes do not overflow") {
  const auto check = [](auto type) {
    using T = decltype(type);
    const RawFrames<T> raw(
        20, 2, make_frames<T>(20, 2, 600, [](int f, int x, int) {
          const bool high = x < 10 || (x < 15 && f % 2 == 0);
          return static_cast<double>(high ? std::numeric_limits<T>::max() : std::numeric_limits<T>::lowest());
        }));
    const auto means = mean_frame(raw.stack(), {{0, 0, 20, 2}}, {});
    REQUIRE(means);
    check_means(raw, *means);
  };
  check(std::uint8_t{});
  check(std::int8_t{});
  check(std::uint16_t{});
  check(std::int16_t{});
  check(std::uint32_t{});
  check(std::int32_t{});
}

TEST_CASE("wide pixels far from zero keep thirds of a code") {
  // 3 frames of 4 000 000 000 + {0, 0, 1} or {1, 1, 0}: the means are a third and two thirds above. The level
  // is the median of a row of the first frame: the upper one of four, 4 000 000 001.
  const RawFrames<std::uint32_t> raw(4, 1, make_frames<std::uint32_t>(4, 1, 3, [](int f, int x, int) {
                                       return 4e9 + (x % 2 == 0 ? (f == 2 ? 1 : 0) : (f == 2 ? 0 : 1));
                                     }));
  const auto means = mean_frame(raw.stack(), {{0, 0, 4, 1}}, {});
  REQUIRE(means);
  const PixelMeans& region = (*means)[0];
  CHECK(region.level_dn == 4000000001.0);
  CHECK(region.means()[0] == static_cast<float>(-2.0 / 3));
  CHECK(region.means()[1] == static_cast<float>(-1.0 / 3));
}

TEST_CASE("the same bits for any number of threads, variances included") {
  boost::random::mt19937_64 random(8);
  boost::random::normal_distribution<double> noise(300.0, 12.5);
  const int width = 517;
  const int height = 203;
  const RawFrames<double> raw(
      width, height, make_frames<double>(width, height, 5, [&](int, int, int) { return noise(random); }));
  const auto regions = regions_of(width, height);
  MeanFrameOptions options;
  options.frame_means.assign(regions.size(), {300.0, 301.0, 299.5, 300.25, 300.0});
  const auto one = mean_frame(raw.stack(), regions, options);
  options.threads = 3;
  const auto three = mean_frame(raw.stack(), regions, options);
  const auto without = mean_frame(raw.stack(), regions, {});
  REQUIRE(one);
  REQUIRE(three);
  REQUIRE(without);
  for (std::size_t r = 0; r < regions.size(); ++r) {
    CHECK(same_bits((*one)[r].means(), (*three)[r].means()));
    CHECK(same_bits((*one)[r].variances(), (*three)[r].variances()));
    CHECK((*one)[r].variances().size() == (*one)[r].pixels());
    CHECK(same_bits((*one)[r].means(), (*without)[r].means()));
  }
}

TEST_CASE("temporal variances of three pixels in four frames") {
  // {1,2,3,6}, {4,5,5,6}, {7,8,9,12}: means 3, 5, 9; squares (4+1+0+9)/3, (1+0+0+1)/3, (4+1+0+9)/3, whose
  // mean is the 10/3 that a worked example of ISO 15739's formula gives (derived by hand).
  const double pixels[3][4] = {{1, 2, 3, 6}, {4, 5, 5, 6}, {7, 8, 9, 12}};
  const RawFrames<std::uint8_t> raw(
      3, 1, make_frames<std::uint8_t>(3, 1, 4, [&](int f, int x, int) { return pixels[x][f]; }));
  MeanFrameOptions options;
  options.frame_means = {{0, 0, 0, 0}};
  const auto means = mean_frame(raw.stack(), {{0, 0, 3, 1}}, options);
  REQUIRE(means);
  const auto variances = (*means)[0].variances();
  CHECK(variances[0] == doctest::Approx(14.0 / 3));
  CHECK(variances[1] == doctest::Approx(2.0 / 3));
  CHECK(variances[2] == doctest::Approx(14.0 / 3));
  // The frames' means are 4, 5, 17/3, 8 with mean 17/3. Without their changes {-5/3, -2/3, 0, 7/3} the pixels
  // are {8/3, 8/3, 3, 11/3}, {17/3, 17/3, 5, 11/3}, {26/3, 26/3, 9, 29/3}: sums of squares about 3, 5, 9 of
  // 6/9, 24/9 and 6/9.
  options.frame_means = {{4, 5, 17.0 / 3, 8}};
  const auto steady = mean_frame(raw.stack(), {{0, 0, 3, 1}}, options);
  REQUIRE(steady);
  CHECK((*steady)[0].variances()[0] == doctest::Approx(2.0 / 9));
  CHECK((*steady)[0].variances()[1] == doctest::Approx(8.0 / 9));
  CHECK((*steady)[0].variances()[2] == doctest::Approx(2.0 / 9));
}

TEST_CASE("an offset that jitters from frame to frame is not in the median read noise") {
  boost::random::mt19937_64 random(9);
  boost::random::normal_distribution<double> noise(1000.0, 4.0);
  const int frames = 16;
  const RawFrames<std::uint16_t> raw(
      256, 256, make_frames<std::uint16_t>(256, 256, frames, [&](int f, int x, int y) {
        // One pixel in 64 is ten times as noisy, and one hit far off: a median does not see them.
        const double sample = noise(random);
        const double pixel = x % 8 == 0 && y % 8 == 0 ? 1000 + 10 * (sample - 1000) : sample;
        return std::lround(pixel) + 20 * (f % 4) + (f == 3 && x == 9 && y == 9 ? 5000 : 0);
      }));
  MeanFrameOptions options;
  std::vector<double> levels;
  for (const auto& frame : raw.frames())
    levels.push_back(std::accumulate(frame.begin(), frame.end(), 0.0) / static_cast<double>(frame.size()));
  options.frame_means = {levels};
  const auto means = mean_frame(raw.stack(), {{0, 0, 256, 256}}, options);
  REQUIRE(means);
  // 16 + 1/12 of rounding; the median of chi^2 with 15 degrees of freedom is 14.33886 (standard tables). The
  // noisy pixels all lie above, so that the median is that of rank 0.5 / (1 - 1/64) = 0.5079 of the others,
  // whose deviations have a spread of sqrt(1/30) = 0.183 and so a density of 2.18 there: higher by 0.0079
  // / 2.18 = 0.36 %. Its standard deviation is 1.25 x 0.183 / 256 = 0.09 %.
  const double expected = 1.0036 * std::sqrt((16 + 1.0 / 12) * 14.33886 / 15);
  CHECK((*means)[0].variances()[9 * 256 + 9] > 1e6);
  CHECK(median_deviation((*means)[0].variances()) == doctest::Approx(expected).epsilon(0.003));
}

TEST_CASE("a hit is left out of the mean, pixels that blink and light that drifts are not") {
  constexpr int kFrames = 8;
  auto frames = make_frames<std::uint16_t>(
      64, 40, kFrames, [](int f, int x, int y) { return 1000 + 3 * f + (7 * x + 11 * y + 5 * f) % 13; });
  const auto at = [](int x, int y) { return static_cast<std::size_t>(y * 64 + x); };
  const std::vector<std::vector<std::uint16_t>> clean = frames;
  frames[3][at(10, 20)] = 9000;                                       // a hit
  for (const std::size_t f : {1, 4, 6}) frames[f][at(30, 5)] = 3000;  // blinks
  MeanFrameOptions options;
  options.hit_limits = {200};
  options.threads = 3;
  const RawFrames<std::uint16_t> raw(64, 40, frames);
  const auto means = mean_frame(raw.stack(), {{0, 0, 64, 40}}, options);
  REQUIRE(means);
  for (int y = 0; y < 40; ++y)
    for (int x = 0; x < 64; ++x) {
      double sum = 0;
      int count = 0;
      for (std::size_t f = 0; f < kFrames; ++f) {
        if (x == 10 && y == 20 && f == 3) continue;
        sum += frames[f][at(x, y)];
        ++count;
      }
      REQUIRE((*means)[0].level_dn + static_cast<double>((*means)[0].means()[at(x, y)]) ==
              doctest::Approx(sum / count).epsilon(1e-7));
    }
}

TEST_CASE("a median of an even number lies between the two middle ones") {
  std::vector<float> odd{9, 1, 4};
  std::vector<float> even{9, 1, 4, 16};
  CHECK(median_deviation(odd) == 2.0);
  CHECK(median_deviation(even) == 2.5);
}

TEST_CASE("one frame is its own mean and has no variance") {
  const RawFrames<std::uint16_t> raw(
      5, 4, make_frames<std::uint16_t>(5, 4, 1, [](int, int x, int y) { return 10 * y + x; }));
  MeanFrameOptions options;
  options.frame_means = {{22.0}};
  const auto means = mean_frame(raw.stack(), {{1, 1, 3, 2}}, options);
  REQUIRE(means);
  CHECK((*means)[0].level_dn + static_cast<double>((*means)[0].means()[4]) == 22.0);
  CHECK((*means)[0].variances().empty());
}

TEST_CASE("a pixel that is not finite is an error that names the page, unless it lies outside") {
  auto frames = make_frames<float>(64, 64, 3, [](int, int x, int) { return x; });
  frames[2][40 * 64 + 50] = std::numeric_limits<float>::infinity();
  const RawFrames<float> raw(64, 64, frames);
  const auto whole = mean_frame(raw.stack(), {{0, 0, 64, 64}}, {});
  REQUIRE(!whole);
  CHECK(to_line(whole.error()).find("page 3: found a pixel that is not a finite number") !=
        std::string::npos);
  CHECK(mean_frame(raw.stack(), {{0, 0, 50, 64}, {50, 41, 14, 23}}, {}));
}

TEST_CASE("a mean that a float cannot hold is an error that says so") {
  const RawFrames<double> raw(
      4, 2, make_frames<double>(4, 2, 2, [](int, int x, int) { return x == 3 ? 1e300 : 1.0; }));
  const auto means = mean_frame(raw.stack(), {{0, 0, 4, 2}}, {});
  REQUIRE(!means);
  CHECK(to_line(means.error()).find("found a pixel with a mean of 1e+300") != std::string::npos);
}
