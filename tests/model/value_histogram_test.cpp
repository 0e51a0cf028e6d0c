#include "model/value_histogram.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numeric>
#include <vector>

using namespace evenfield;

TEST_CASE("each multiple of 1/L falls into its bin whatever rounding did to it") {
  // The rule in whole numbers: bin of multiple m is m / I, for any L and range.
  for (const int frames : {1, 3, 7, 16, 100})
    for (const int multiples : {0, 1, 255, 256, 257, 511, 512, 1280, 5000}) {
      CAPTURE(frames);
      CAPTURE(multiples);
      const double lowest = 1000.25;
      std::vector<float> values;
      for (int m = 0; m <= multiples; ++m) values.push_back(static_cast<float>(lowest + 1.0 * m / frames));
      const ValueBins bins =
          bins_of_means(static_cast<double>(values.front()), static_cast<double>(values.back()), frames);
      const int together = multiples / 256 + 1;
      REQUIRE(bins.count == multiples / together + 1);
      CHECK(bins.count <= 256);
      const auto counts = count_values(values, bins);
      for (int bin = 0; bin + 1 < bins.count; ++bin) CHECK(counts[static_cast<std::size_t>(bin)] == together);
      CHECK(std::accumulate(counts.begin(), counts.end(), std::int64_t{0}) == multiples + 1);
      // A full bin's centre is the mean of the multiples in it.
      CHECK(bins.centre(0) == doctest::Approx(lowest + (together - 1) / 2.0 / frames).epsilon(1e-6));
    }
}

TEST_CASE("huge and empty ranges have bins too") {
  const ValueBins huge = bins_of_means(0, 4e9, 1000000);
  CHECK(huge.count <= 256);
  CHECK(huge.centre(huge.count - 1) == doctest::Approx(4e9).epsilon(0.01));
  CHECK(bins_of_means(5, 5, 8).count == 1);
  const ValueBins even = bins_of_range(0.25, 0.25);
  CHECK(even.count == 1);
  CHECK(count_values(std::vector<float>{0.25F, 0.25F}, even) == std::vector<std::int64_t>{2});
}

TEST_CASE("values of any fraction share 256 bins and both ends count") {
  const ValueBins bins = bins_of_range(-1, 1);
  CHECK(bins.count == 256);
  CHECK(bins.width == 1.0 / 128);
  CHECK(bins.first == -1 + 1.0 / 256);
  const auto counts = count_values(std::vector<float>{-1, -0.9999F, 0, 1, 2, -2}, bins);
  CHECK(counts.front() == 3);  // -2 lies beyond the end
  CHECK(counts[128] == 1);
  CHECK(counts.back() == 2);
}

TEST_CASE("deviations are counted from each threshold on, up and down together") {
  // From 10: 0, 1, 1, 2.5, 4; thresholds 0, 1, 2, 3, 4.
  const std::vector<float> values{10, 11, 9, 12.5F, 6};
  CHECK(count_deviations(values, 10, 1) == std::vector<std::int64_t>{5, 4, 2, 1, 1});
  CHECK(count_deviations(values, 10, 100) == std::vector<std::int64_t>{5});
  CHECK(count_deviations({}, 10, 1) == std::vector<std::int64_t>{0});
  // Thresholds that binary fractions do not hold: 3 x 0.1 > 0.3 in double precision, and a deviation of 0.3
  // is below it; float's 0.3 is above.
  CHECK(count_deviations(std::vector<float>{0.3F}, 0, 0.1).size() == 4);
  CHECK(count_deviations(std::vector<float>{0}, -0.3, 0.1).size() == 3);
  // Quotients that rounding takes across a whole number: in double precision 1.7 / 0.1 is 17 though 17 x 0.1
  // is more than 1.7, and 4.3 / 0.1 is less than 43 though 43 x 0.1 is 4.3.
  CHECK(count_deviations(std::vector<float>{0}, -1.7, 0.1).size() == 17);
  CHECK(count_deviations(std::vector<float>{0}, -4.3, 0.1).size() == 44);
  // No more than 100000 thresholds, and nothing lost.
  const auto most = count_deviations(std::vector<float>{0, 3e38F}, 0, 1e-3);
  CHECK(most.size() == 100000);
  CHECK(most.front() == 2);
  CHECK(most.back() == 1);
}

TEST_CASE("the normal curve over a histogram holds all pixels") {
  double sum = 0;
  for (int bin = -60; bin <= 60; ++bin) sum += normal_count(1e6, 0.1, bin * 0.1, 0.03, 1);
  // The sum over equal steps of a normal curve is exact to exp(-2 pi^2 (sigma/step)^2); beyond 6 sigma 2e-9.
  CHECK(sum == doctest::Approx(1e6).epsilon(1e-8));
  CHECK(normal_count(100, 0.5, 3, 3, 2) == doctest::Approx(100 * 0.5 / (2 * 2.5066282746)).epsilon(1e-10));
}
