#include "analyse/mean_frame_statistics.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>
#include <functional>
#include <numbers>
#include <numeric>

using namespace evenfield;

namespace {

/// Gain for white noise of the filter of METHODS 5.3 (SP-05, derived there).
constexpr double kNoiseGain = 0.9884951081;

/// width x height pixels of a function of column and row.
class Image {
 public:
  Image(int width, int height, const std::function<double(int, int)>& value) {
    for (int y = 0; y < height; ++y)
      for (int x = 0; x < width; ++x) pixels_.push_back(static_cast<float>(value(x, y)));
    input_ = {pixels_, width, height, 0, 16, 0, false};
  }
  MeanFrameInput input() const { return input_; }
  MeanFrameStatistics statistics(bool pictures = true) const { return measured(input_, pictures); }
  static MeanFrameStatistics measured(const MeanFrameInput& input, bool pictures = true) {
    MeanFrameStatisticsOptions options;
    options.pictures = pictures;
    return mean_frame_statistics(input, options);
  }

 private:
  std::vector<float> pixels_;
  MeanFrameInput input_;
};

/// Columns of threes brighter by 20, and a pattern without an order that the eye sees.
Image pattern() {
  return {48, 40,
          [](int x, int y) { return 200 + (x * 37 + y * 73 + x * y * 5) % 101 + (x % 3 == 0 ? 20 : 0); }};
}

Image white_noise(int width, int height, double deviation, std::uint64_t seed) {
  boost::random::mt19937_64 random(seed);
  boost::random::normal_distribution<double> noise(1000.0, deviation);
  return {width, height, [&](int, int) { return noise(random); }};
}

double total(const Histogram& histogram) {
  return static_cast<double>(
      std::accumulate(histogram.counts.begin(), histogram.counts.end(), std::int64_t{0}));
}

}  // namespace

TEST_CASE("spectra, white parts and profiles of a known pattern are those of numpy") {
  // numpy of the same pattern: p = mean(|fft(y - mean(y), axis=1)|^2 / 48, axis 0), and with the axes
  // exchanged; y.var() = 924.5395659722222.
  const MeanFrameStatistics got = pattern().statistics();
  REQUIRE(got.pictures);
  const MeanFrame& frame = *got.pictures;
  CHECK(frame.frames == 16);
  CHECK(frame.mean_dn == doctest::Approx(258.12083333333334).epsilon(1e-12));
  CHECK(frame.of_rows.length == 48);
  CHECK(frame.of_rows.lines == 40);
  CHECK(frame.of_columns.length == 40);
  CHECK(frame.of_columns.lines == 48);
  REQUIRE(frame.of_rows.amplitude_dn.size() == 25);
  REQUIRE(frame.of_columns.amplitude_dn.size() == 21);
  const auto power = [](const Spectrogram& s, std::size_t v) {
    return s.amplitude_dn[v] * s.amplitude_dn[v];
  };
  CHECK(power(frame.of_rows, 0) == doctest::Approx(1906.0783333333336).epsilon(1e-6));
  CHECK(power(frame.of_rows, 1) == doctest::Approx(348.52182388691165).epsilon(1e-6));
  CHECK(power(frame.of_rows, 16) == doctest::Approx(2505.790104166666).epsilon(1e-6));  // a third of a cycle
  CHECK(power(frame.of_rows, 24) == doctest::Approx(1300.7500000000007).epsilon(1e-6));
  CHECK(power(frame.of_columns, 0) == doctest::Approx(4761.190972222223).epsilon(1e-6));
  CHECK(power(frame.of_columns, 7) == doctest::Approx(882.7070203819209).epsilon(1e-6));
  CHECK(power(frame.of_columns, 20) == doctest::Approx(1057.5437499999998).epsilon(1e-6));
  CHECK(frame.of_rows.temporal_dn == 0);
  const auto non_whiteness = [](const Spectrogram& s) { return s.non_whiteness * s.white_dn * s.white_dn; };
  CHECK(non_whiteness(frame.of_rows) == doctest::Approx(924.5395659722222).epsilon(1e-3));
  CHECK(non_whiteness(frame.of_columns) == doctest::Approx(924.5395659722222).epsilon(1e-3));
  const auto value = [](int x, int y) {
    return 200.0 + (x * 37 + y * 73 + x * y * 5) % 101 + (x % 3 == 0 ? 20 : 0);
  };
  REQUIRE(frame.along_row.mean.size() == 48);
  REQUIRE(frame.along_column.mean.size() == 40);
  for (int x = 0; x < 48; ++x) {
    double sum = 0, low = 1e9, high = 0;
    for (int y = 0; y < 40; ++y) {
      sum += value(x, y);
      low = std::min(low, value(x, y));
      high = std::max(high, value(x, y));
    }
    const auto i = static_cast<std::size_t>(x);
    CHECK(frame.along_row.middle[i] == value(x, 20));
    CHECK(frame.along_row.mean[i] == doctest::Approx(sum / 40).epsilon(1e-12));
    CHECK(frame.along_row.lowest[i] == low);
    CHECK(frame.along_row.highest[i] == high);
  }
  for (int y = 0; y < 40; ++y) {
    double sum = 0, low = 1e9, high = 0;
    for (int x = 0; x < 48; ++x) {
      sum += value(x, y);
      low = std::min(low, value(x, y));
      high = std::max(high, value(x, y));
    }
    const auto i = static_cast<std::size_t>(y);
    CHECK(frame.along_column.middle[i] == value(24, y));
    CHECK(frame.along_column.mean[i] == doctest::Approx(sum / 48).epsilon(1e-12));
    CHECK(frame.along_column.lowest[i] == low);
    CHECK(frame.along_column.highest[i] == high);
  }
}

TEST_CASE("the high-pass variance of a known pattern is that of numpy and scipy") {
  // kernel = convolve of ones(7)/7, ones(11)/11 and (1 2 1)/4; ndimage.correlate1d along both axes; variance
  // (ddof=1) of pattern - low-pass over [9:-9, 9:-9], 30 x 22 pixels: 913.0429907064902.
  const HighPassVariance high_pass = pattern().statistics(false).high_pass;
  CHECK(high_pass.pixels == 30 * 22);
  CHECK(high_pass.noise_gain == doctest::Approx(kNoiseGain).epsilon(1e-9));
  REQUIRE(high_pass.filtered_dn2);
  CHECK(*high_pass.filtered_dn2 == doctest::Approx(913.0429907064902).epsilon(1e-5));
  CHECK(*high_pass.variance_dn2 == doctest::Approx(913.0429907064902 / kNoiseGain).epsilon(1e-5));
  CHECK(high_pass.note.empty());
  // Temporal noise is taken out as the filter passes it.
  const Image same = pattern();
  MeanFrameInput noisy = same.input();
  noisy.noise_left_dn2 = 100;
  const HighPassVariance less = Image::measured(noisy, false).high_pass;
  CHECK(*less.variance_dn2 == doctest::Approx(913.0429907064902 / kNoiseGain - 100).epsilon(1e-5));
  CHECK(*less.filtered_dn2 == doctest::Approx(913.0429907064902 - 100 * kNoiseGain).epsilon(1e-5));
}

TEST_CASE("white noise of known spread is white") {
  const int width = 320;
  const int height = 256;
  const Image image = white_noise(width, height, 3.0, 11);
  const MeanFrameStatistics got = image.statistics();
  REQUIRE(got.pictures);
  // Spread of a variance: sqrt(2 / n), of the whole image 0.49 %, of the interior (302 x 238) 0.53 %. A p is
  // the mean of 256 (320) exponentials, spread 1/16, and its median is low by a third of 1/256; half of the
  // values are different ones, whose median has a spread of 1.25 / 16 / sqrt(160) = 0.62 %. Four of them.
  for (const Spectrogram& s : {got.pictures->of_rows, got.pictures->of_columns}) {
    CHECK(s.white_dn * s.white_dn == doctest::Approx(9.0).epsilon(0.025));
    CHECK(s.non_whiteness == doctest::Approx(1.0).epsilon(0.032));
  }
  CHECK(got.pictures->normal_dn == doctest::Approx(3.0).epsilon(0.0125));
  CHECK(*got.high_pass.variance_dn2 == doctest::Approx(9.0).epsilon(0.022));
  CHECK(got.high_pass.pixels == (width - 18) * (height - 18));

  // If 5 of the 9 DN^2 are temporal noise, a pattern of 4 is left; the histogram shows both.
  MeanFrameInput noisy = image.input();
  noisy.noise_left_dn2 = 5;
  const MeanFrameStatistics less = Image::measured(noisy);
  for (const Spectrogram& s : {less.pictures->of_rows, less.pictures->of_columns}) {
    CHECK(s.white_dn == doctest::Approx(2.0).epsilon(0.028));
    CHECK(s.non_whiteness == doctest::Approx(1.0).epsilon(0.072));
    CHECK(s.temporal_dn == doctest::Approx(std::sqrt(5.0)));
  }
  CHECK(less.pictures->normal_dn == doctest::Approx(got.pictures->normal_dn).epsilon(1e-6));
  CHECK(*less.high_pass.variance_dn2 == doctest::Approx(*got.high_pass.variance_dn2 - 5).epsilon(1e-9));
}

TEST_CASE("a pattern smaller than its temporal noise gives a negative variance and no amplitude") {
  const Image image = white_noise(64, 48, 1.0, 3);
  MeanFrameInput input = image.input();
  input.noise_left_dn2 = 4;
  const MeanFrameStatistics got = Image::measured(input);
  CHECK(*got.high_pass.variance_dn2 < -2);
  CHECK(got.pictures->of_rows.white_dn == 0);
  CHECK(got.pictures->of_rows.non_whiteness == 0);
  CHECK(*std::max_element(got.pictures->of_rows.amplitude_dn.begin(),
                          got.pictures->of_rows.amplitude_dn.end()) == 0);
}

TEST_CASE("a sine shows at its frequency with the amplitude of its theory") {
  // a sin(2 pi x / 16) along rows of 256: |Y|^2 / N = (a N / 2)^2 / N at v = 16, nothing elsewhere. Along
  // columns it is a constant: at v = 0, 100 rows x a^2 / 2.
  const Image image(256, 100, [](int x, int) { return 500 + 8 * std::sin(2 * std::numbers::pi * x / 16); });
  const MeanFrame frame = *image.statistics().pictures;
  for (std::size_t v = 0; v < frame.of_rows.amplitude_dn.size(); ++v) {
    const double expected = v == 16 ? 8 * std::sqrt(256.0) / 2 : 0.0;
    CHECK(std::abs(frame.of_rows.amplitude_dn[v] - expected) < 1e-3);
  }
  CHECK(frame.of_columns.amplitude_dn[0] == doctest::Approx(std::sqrt(100 * 32.0)).epsilon(1e-5));
  for (std::size_t v = 1; v < frame.of_columns.amplitude_dn.size(); ++v)
    CHECK(frame.of_columns.amplitude_dn[v] < 1e-3);
}

TEST_CASE("a pattern of columns does not pass for the noise of pixels") {
  boost::random::mt19937_64 random(21);
  boost::random::normal_distribution<double> noise(0.0, 2.0);
  std::vector<double> columns(400);
  for (double& column : columns) column = 5 * noise(random);
  const Image image(400, 300,
                    [&](int x, int) { return 300 + columns[static_cast<std::size_t>(x)] + noise(random); });
  const MeanFrame frame = *image.statistics().pictures;
  // Only the columns' means at v = 0 hold it: 300 x 100 DN^2, less what 400 columns' spread differs by (14 %
  // for four times sqrt(2 / 399) / 2 of the amplitude).
  CHECK(frame.of_columns.amplitude_dn[0] == doctest::Approx(std::sqrt(30000.0)).epsilon(0.15));
  CHECK(frame.of_columns.white_dn == doctest::Approx(2.0).epsilon(0.02));
  CHECK(frame.of_columns.non_whiteness == doctest::Approx(26.0).epsilon(0.3));
  CHECK(frame.of_rows.white_dn > 5);
  CHECK(frame.normal_dn == frame.of_columns.white_dn);
}

TEST_CASE("the high-pass takes out what changes slowly and leaves the pixels' pattern") {
  // A symmetric filter keeps planes, and turns a parabola into a constant: nothing is left but the rounding
  // of floats near 8000 (half of 2^-11 at most).
  const Image slow(200, 150, [](int x, int y) {
    return 8000 - 0.05 * (x - 90) * (x - 90) - 0.08 * (y - 70) * (y - 70) + 3 * x - 2 * y;
  });
  CHECK(*slow.statistics(false).high_pass.variance_dn2 < 1e-6);
  boost::random::mt19937_64 random(22);
  boost::random::normal_distribution<double> noise(0.0, 4.0);
  const Image lit(300, 250, [&](int x, int y) {
    return 8000 - 0.05 * (x - 90) * (x - 90) - 0.08 * (y - 70) * (y - 70) + noise(random);
  });
  // 282 x 232 pixels: 4 sqrt(2 / 65424) = 2.2 %.
  const HighPassVariance high_pass = lit.statistics(false).high_pass;
  CHECK(*high_pass.variance_dn2 == doctest::Approx(16.0).epsilon(0.022));
}

TEST_CASE("a region that the filter does not fit into has no high-pass variance but a reason") {
  for (const auto& [width, height] : {std::pair{18, 300}, std::pair{300, 18}, std::pair{19, 19}}) {
    const MeanFrameStatistics got = white_noise(width, height, 3, 4).statistics();
    CHECK(!got.high_pass.variance_dn2);
    CHECK(!got.high_pass.filtered_dn2);
    CHECK(got.high_pass.note.find(std::to_string(width) + " x " + std::to_string(height)) !=
          std::string::npos);
    CHECK(got.pictures);
  }
  CHECK(white_noise(20, 19, 3, 4).statistics().high_pass.variance_dn2);
}

TEST_CASE("lines of fourteen thousand pixels are shortened, those of one or two work") {
  for (const bool turned : {false, true}) {
    const Image image(turned ? 2 : 14000, turned ? 14000 : 2, [&](int x, int y) {
      const int along = turned ? y : x;
      return 100 + along % 7 + (along == 9001 ? 500 : 0) - (along == 33 ? 50 : 0);
    });
    const MeanFrame frame = *image.statistics().pictures;
    const Profiles& lines = turned ? frame.along_column : frame.along_row;
    const Spectrogram& spectrum = turned ? frame.of_columns : frame.of_rows;
    const Spectrogram& across = turned ? frame.of_rows : frame.of_columns;
    // 14000 values by fours, 7001 by twos: the fewest that stay below 4096.
    CHECK(lines.middle.size() == 3500);
    CHECK(lines.mean.size() == 3500);
    CHECK(spectrum.amplitude_dn.size() == 3501);
    CHECK(spectrum.length == 14000);
    CHECK(spectrum.lines == 2);
    CHECK(across.length == 2);
    CHECK(across.lines == 14000);
    CHECK(across.amplitude_dn.size() == 2);
    // 9000 to 9003 are 5, 6 + 500, 0 and 1 above 100: 9000 = 7 x 1285 + 5.
    CHECK(lines.highest[2250] == 606);
    CHECK(lines.mean[2250] == 100 + 512.0 / 4);
    // 32 to 35 are 4, 5 - 50, 6 and 0 above 100.
    CHECK(lines.lowest[8] == 55);
  }
  for (const auto& [width, height] : {std::pair{1, 1}, std::pair{2, 2}, std::pair{1, 5}, std::pair{3, 1}}) {
    const MeanFrame frame =
        *Image(width, height, [](int x, int y) { return 7 + x + 3 * y; }).statistics().pictures;
    CHECK(frame.mean_dn == 7 + (width - 1) / 2.0 + 3 * (height - 1) / 2.0);
    CHECK(frame.of_rows.amplitude_dn.size() == static_cast<std::size_t>(width / 2 + 1));
    CHECK(frame.of_columns.amplitude_dn.size() == static_cast<std::size_t>(height / 2 + 1));
    CHECK(total(frame.values) == width * height);
    CHECK(std::isfinite(frame.of_rows.non_whiteness));
    CHECK(std::isfinite(frame.normal_dn));
  }
}

TEST_CASE("histograms follow the rule of the data sheet") {
  // METHODS 5.5 (SP-07, derived there): 16 frames from 10 to 90 DN give 214 bins of 6/16 DN, the first
  // centred at 10 + 5/32. Values are multiples of 1/16: k / 16 from 10 on, each once, and the last.
  const Image image(1281, 1, [](int x, int) { return 10 + x / 16.0; });
  const MeanFrame frame = *image.statistics().pictures;
  CHECK(frame.values.width == 6.0 / 16);
  CHECK(frame.values.first == 10 + 5.0 / 32);
  REQUIRE(frame.values.counts.size() == 214);
  for (std::size_t i = 0; i < 213; ++i) CHECK(frame.values.counts[i] == 6);
  CHECK(frame.values.counts[213] == 1281 - 213 * 6);
  // Mean 50: |y - 50| >= t holds for the 1281 values less those nearer.
  const Histogram& far = frame.deviations;
  REQUIRE(!far.counts.empty());
  for (std::size_t i = 0; i < far.counts.size(); ++i) {
    const double threshold = far.first + static_cast<double>(i) * far.width;
    std::int64_t expected = 0;
    for (int k = 0; k <= 1280; ++k) expected += std::abs(k / 16.0 - 40) >= threshold ? 1 : 0;
    CHECK(far.counts[i] == expected);
  }
  CHECK(far.first == 0);
  CHECK(far.counts.back() > 0);

  // The level is added without changing the counts.
  MeanFrameInput raised = image.input();
  raised.level_dn = 4e9;
  const MeanFrame higher = *Image::measured(raised).pictures;
  CHECK(higher.values.counts == frame.values.counts);
  CHECK(higher.values.first == 4e9 + 10 + 5.0 / 32);
  CHECK(higher.mean_dn == 4e9 + 50);
  CHECK(higher.along_row.middle[16] == 4e9 + 11);
  CHECK(higher.deviations.counts == frame.deviations.counts);
}

TEST_CASE("values that are no multiples of a step get bins by their range") {
  const Image image(200, 100, [](int x, int y) { return 0.25 + 1e-6 * x + 1e-5 * y; });
  MeanFrameInput input = image.input();
  input.continuous = true;
  const MeanFrame fine = *Image::measured(input).pictures;
  CHECK(fine.values.counts.size() == 256);
  CHECK(total(fine.values) == 20000);
  CHECK(fine.values.counts.back() > 0);
  // Taken for multiples of 1/16 all fall into one.
  CHECK(image.statistics().pictures->values.counts.size() == 1);
  // And all values equal.
  const Image even(30, 20, [](int, int) { return 5.5; });
  input = even.input();
  input.continuous = true;
  const MeanFrame one = *Image::measured(input).pictures;
  CHECK(one.values.counts == std::vector<std::int64_t>{600});
  CHECK(one.normal_dn == 0);
  CHECK(one.of_rows.non_whiteness == 0);
}

TEST_CASE("without pictures only the high-pass variance is computed, and threads change nothing") {
  const Image image = white_noise(150, 120, 6, 5);
  const MeanFrameStatistics bare = image.statistics(false);
  CHECK(!bare.pictures);
  MeanFrameStatisticsOptions options;
  options.pictures = true;
  options.threads = 3;
  const MeanFrameStatistics one = image.statistics();
  const MeanFrameStatistics three = mean_frame_statistics(image.input(), options);
  CHECK(one.high_pass.variance_dn2 == bare.high_pass.variance_dn2);
  CHECK(one.high_pass.variance_dn2 == three.high_pass.variance_dn2);
  CHECK(one.pictures->of_rows.amplitude_dn == three.pictures->of_rows.amplitude_dn);
  CHECK(one.pictures->of_columns.amplitude_dn == three.pictures->of_columns.amplitude_dn);
  CHECK(one.pictures->along_column.mean == three.pictures->along_column.mean);
  CHECK(one.pictures->values.counts == three.pictures->values.counts);
  CHECK(one.pictures->normal_dn == three.pictures->normal_dn);
}
