#include "analyse/series_summary.h"

#include <doctest/doctest.h>

#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>

#include "accumulate/accumulate.h"
#include "accumulate/raw_frames.h"
#include "model/stack_variance.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

constexpr int kSide = 128;

RegionStatistics statistics_of(const std::vector<std::vector<double>>& frames) {
  const RawFrames<double> raw(kSide, kSide, frames);
  AccumulateOptions options;
  options.hit_threshold = 0;
  return accumulate(raw.stack(), make_geometry(raw.shape(), {{0, 0, kSide, kSide}}), options)->regions[0];
}

/// Uneven light that falls off by 80 % towards one side, in electrons, at gain 1.
double light(int x) { return 10000.0 * (1.0 - 0.8 * x / kSide); }

}  // namespace

TEST_CASE("without drift the variance is that of the plain definition") {
  boost::random::mt19937_64 random(1);
  boost::random::normal_distribution<double> noise(0, 1);
  for (const int count : {2, 3, 8, 12}) {
    const auto frames = make_frames<double>(
        kSide, kSide, count, [&](int, int x, int y) { return 500 + x + 3 * y + 7 * noise(random); });
    const RegionSummary s = summarize(statistics_of(frames), std::nullopt);
    const auto plain = temporal_variance(frames);
    REQUIRE(plain);
    CHECK(*s.variance == doctest::Approx(plain->unbiased).epsilon(1e-9));
    double mean = 0;
    for (const auto& frame : frames)
      for (const double v : frame) mean += v / (count * kSide * kSide);
    CHECK(s.mean == doctest::Approx(mean).epsilon(1e-12));
  }
}

TEST_CASE("drift of the light over uneven light leaves the variance of every block in place") {
  boost::random::mt19937_64 random(2);
  boost::random::normal_distribution<double> noise(0, 1);
  constexpr double kDark = 100;
  constexpr int kFrames = 12;
  std::vector<double> scale;
  for (int f = 0; f < kFrames; ++f) scale.push_back(1 + 0.02 * noise(random));
  const auto frames = make_frames<double>(kSide, kSide, kFrames, [&](int f, int x, int) {
    const double electrons = scale[static_cast<std::size_t>(f)] * light(x);
    return kDark + electrons + std::sqrt(electrons + 25) * noise(random);
  });
  const RegionStatistics statistics = statistics_of(frames);
  const RegionSummary s = summarize(statistics, kDark);
  REQUIRE(s.scaled);
  const double signal = s.mean - kDark;
  CHECK(*s.variance == doctest::Approx(signal + 25).epsilon(4 * std::sqrt(2 / s.dof)));
  for (std::size_t b = 0; b < s.block_mean.size(); ++b) {
    const double expected = s.block_mean[b] - kDark + 25;
    CHECK(s.block_squares[b] / s.block_dof[b] ==
          doctest::Approx(expected).epsilon(5 * std::sqrt(2 / s.block_dof[b])));
  }
  // A variance about plain frame means would be off by (2 %)^2 x variance of the light = 2000 DN^2.
  const RegionSummary plain = summarize(statistics, std::nullopt);
  CHECK(*plain.variance > signal + 25 + 1000);
  CHECK(std::sqrt(*s.frame_mean_variance) / signal == doctest::Approx(0.02).epsilon(0.7));
  CHECK(std::abs(*s.row_noise_variance) <
        10 * (signal + 25) / kSide * std::sqrt(2.0 / (kSide * (kFrames - 1))));
}

TEST_CASE(
    "an offset that jumps from frame to frame is no noise of the pixels but is seen in the frame means") {
  boost::random::mt19937_64 random(3);
  boost::random::normal_distribution<double> noise(0, 1);
  std::vector<double> jump;
  for (int f = 0; f < 16; ++f) jump.push_back(3 * noise(random));
  const auto frames = make_frames<double>(kSide, kSide, 16, [&](int f, int, int) {
    return 100 + jump[static_cast<std::size_t>(f)] + 2 * noise(random);
  });
  const RegionSummary s = summarize(statistics_of(frames), std::nullopt);
  CHECK(*s.variance == doctest::Approx(4).epsilon(4 * std::sqrt(2 / s.dof)));
  double mean = 0;
  double squares = 0;
  for (const double j : jump) mean += j / 16;
  for (const double j : jump) squares += (j - mean) * (j - mean) / 15;
  CHECK(*s.frame_mean_variance == doctest::Approx(squares).epsilon(0.02));
}

TEST_CASE("the spatial variance is that of the pattern, temporal noise taken out, and row noise is found") {
  boost::random::mt19937_64 random(4);
  boost::random::normal_distribution<double> noise(0, 1);
  std::vector<double> pattern;
  for (int i = 0; i < kSide * kSide; ++i) pattern.push_back(3 * noise(random));
  std::vector<double> row;
  for (int i = 0; i < kSide * 8; ++i) row.push_back(1.5 * noise(random));
  const auto frames = make_frames<double>(kSide, kSide, 8, [&](int f, int x, int y) {
    return 100 + pattern[static_cast<std::size_t>(y * kSide + x)] +
           row[static_cast<std::size_t>(f * kSide + y)] + 5 * noise(random);
  });
  const RegionSummary s = summarize(statistics_of(frames), std::nullopt);
  // 9 of the pattern; its own scatter 9 x sqrt(2 / 16384) and that of the noise taken out add to 0.15 at one
  // sigma.
  CHECK(*s.spatial_variance == doctest::Approx(9).epsilon(0.07));
  CHECK(*s.row_noise_variance == doctest::Approx(2.25).epsilon(4 * std::sqrt(2.0 / (127 * 7))));
}

TEST_CASE("one frame has a mean and nothing else") {
  const RegionSummary s =
      summarize(statistics_of(make_frames<double>(kSide, kSide, 1, [](int, int x, int) { return x; })), 0.0);
  CHECK(s.mean == doctest::Approx(63.5));
  CHECK(!s.variance);
  CHECK(!s.spatial_variance);
  CHECK(!s.scaled);
}
