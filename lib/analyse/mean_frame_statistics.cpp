#include "analyse/mean_frame_statistics.h"

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <functional>
#include <numeric>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "base/parallel.h"
#include "model/high_pass.h"
#include "model/spectrum.h"
#include "model/value_histogram.h"

namespace evenfield {
namespace {

std::string size_text(int width, int height) {
  return std::to_string(width) + " x " + std::to_string(height);
}

/// Sums and sums of squares of bands of rows, which do not depend on the threads.
std::vector<std::pair<double, double>> partial_sums(const HighPassImage& image, int threads) {
  constexpr int kRows = 64;
  std::vector<std::pair<double, double>> out(static_cast<std::size_t>((image.height + kRows - 1) / kRows));
  const auto width = static_cast<std::size_t>(image.width);
  (void)for_each_item(static_cast<int>(out.size()), threads, [&](int part, int) -> Status {
    const std::size_t begin = static_cast<std::size_t>(part * kRows) * width;
    const std::size_t end = static_cast<std::size_t>(std::min((part + 1) * kRows, image.height)) * width;
    constexpr std::size_t kLanes = 8;  // one running sum would wait for itself
    double sums[kLanes] = {};
    double squares[kLanes] = {};
    const float* values = image.values.get();
    std::size_t i = begin;
    for (; i + kLanes <= end; i += kLanes)
      for (std::size_t k = 0; k < kLanes; ++k) {
        const auto value = static_cast<double>(values[i + k]);
        sums[k] += value;
        squares[k] += value * value;
      }
    for (std::size_t k = 0; i < end; ++i, ++k) {
      const auto value = static_cast<double>(values[i]);
      sums[k] += value;
      squares[k] += value * value;
    }
    out[static_cast<std::size_t>(part)] = {std::accumulate(sums, sums + kLanes, 0.0),
                                           std::accumulate(squares, squares + kLanes, 0.0)};
    return Done{};
  });
  return out;
}

HighPassVariance high_pass_variance(const MeanFrameInput& input, int threads) {
  const BoxChain chain;
  const int reach = 2 * chain.border() + 1;
  HighPassVariance out;
  out.noise_gain = white_noise_gain(chain);
  const std::int64_t columns = input.width - reach + 1;
  const std::int64_t rows = input.height - reach + 1;
  if (columns < 1 || rows < 1 || columns * rows < 2) {
    out.note = "found a region of " + size_text(input.width, input.height) +
               " pixels, expected more than the " + size_text(reach, reach) + " of the high-pass filter";
    return out;
  }
  const auto filtered = high_pass(input.pixels, input.width, input.height, chain, threads);
  if (!filtered) {
    out.note = filtered.error().what;
    return out;
  }
  // The mean of a filtered image is small against its spread: sums lose no digits.
  double sum = 0;
  double square = 0;
  for (const auto& [part_sum, part_square] : partial_sums(*filtered, threads)) {
    sum += part_sum;
    square += part_square;
  }
  out.pixels = columns * rows;
  const double noise_left = out.noise_gain * (input.noise_left_dn2 - input.row_noise_left_dn2) +
                            line_pattern_gain(chain) * input.row_noise_left_dn2;
  const auto count = static_cast<double>(out.pixels);
  out.filtered_dn2 = (square - sum * sum / count) / (count - 1) - noise_left;
  out.variance_dn2 = *out.filtered_dn2 / out.noise_gain;
  return out;
}

double mean_of(const double* begin, const double* end) {
  return std::accumulate(begin, end, 0.0) / static_cast<double>(end - begin);
}
double lowest_of(const double* begin, const double* end) { return *std::min_element(begin, end); }
double highest_of(const double* begin, const double* end) { return *std::max_element(begin, end); }

/// k neighbours become one, with k as small as will do; the last may stand for fewer.
void shorten(std::vector<double>& values,
             int most_values,
             double (*one_of)(const double* begin, const double* end)) {
  const auto most = static_cast<std::size_t>(std::max(1, most_values));
  const std::size_t together = (values.size() + most - 1) / most;
  if (together <= 1) return;
  std::vector<double> out;
  for (std::size_t i = 0; i < values.size(); i += together)
    out.push_back(one_of(values.data() + i, values.data() + std::min(i + together, values.size())));
  values = std::move(out);
}

void finish_profiles(Profiles& profiles, double level, int most_values) {
  for (std::vector<double>* line : {&profiles.middle, &profiles.mean, &profiles.lowest, &profiles.highest})
    for (double& value : *line) value += level;
  shorten(profiles.middle, most_values, mean_of);
  shorten(profiles.mean, most_values, mean_of);
  shorten(profiles.lowest, most_values, lowest_of);
  shorten(profiles.highest, most_values, highest_of);
}

/// Of the whole image, without the level.
struct Extent {
  double mean, lowest, highest;
};

/// Both directions in one pass, so that the image is read once.
Extent add_profiles(const MeanFrameInput& input, int most_values, MeanFrame& frame) {
  const auto width = static_cast<std::size_t>(input.width);
  const auto height = static_cast<std::size_t>(input.height);
  std::vector<double> sums(width, 0.0);
  std::vector<float> lowest(input.pixels.begin(), input.pixels.begin() + static_cast<std::ptrdiff_t>(width));
  std::vector<float> highest = lowest;
  Profiles& down = frame.along_column;
  for (std::size_t y = 0; y < height; ++y) {
    const float* row = input.pixels.data() + y * width;
    double sum = 0;
    float low = row[0];
    float high = row[0];
    for (std::size_t x = 0; x < width; ++x) {
      sum += static_cast<double>(row[x]);
      low = row[x] < low ? row[x] : low;
      high = row[x] > high ? row[x] : high;
    }
    for (std::size_t x = 0; x < width; ++x) {
      sums[x] += static_cast<double>(row[x]);
      lowest[x] = row[x] < lowest[x] ? row[x] : lowest[x];
      highest[x] = row[x] > highest[x] ? row[x] : highest[x];
    }
    down.middle.push_back(static_cast<double>(row[width / 2]));
    down.mean.push_back(sum / static_cast<double>(width));
    down.lowest.push_back(static_cast<double>(low));
    down.highest.push_back(static_cast<double>(high));
  }
  Profiles& across = frame.along_row;
  const float* middle = input.pixels.data() + height / 2 * width;
  across.middle.assign(middle, middle + width);
  across.lowest.assign(lowest.begin(), lowest.end());
  across.highest.assign(highest.begin(), highest.end());
  for (const double sum : sums) across.mean.push_back(sum / static_cast<double>(height));
  const Extent extent{std::accumulate(down.mean.begin(), down.mean.end(), 0.0) / static_cast<double>(height),
                      *std::min_element(down.lowest.begin(), down.lowest.end()),
                      *std::max_element(down.highest.begin(), down.highest.end())};
  finish_profiles(across, input.level_dn, most_values);
  finish_profiles(down, input.level_dn, most_values);
  return extent;
}

/// A spectrogram, and the white part with the noise that averaging left, where lines have two pixels.
struct WhitePart {
  Spectrogram spectrogram;
  std::optional<double> with_noise_dn2;
};

WhitePart spectrogram_of(const MeanFrameInput& input, LineDirection direction, int most_values) {
  WhitePart out;
  Spectrogram& shown = out.spectrogram;
  const bool rows = direction == LineDirection::rows;
  shown.length = rows ? input.width : input.height;
  shown.lines = rows ? input.height : input.width;
  shown.temporal_dn = std::sqrt(input.noise_left_dn2);
  auto spectrum = line_spectrum(input.pixels, input.width, input.height, direction);
  if (!spectrum) return out;
  if (shown.length > 1) out.with_noise_dn2 = white_part(*spectrum);
  const Spectrum pattern = without_noise(std::move(*spectrum), input.noise_left_dn2);
  shown.white_dn = std::sqrt(std::max(0.0, white_part(pattern)));
  const double factor = non_whiteness(pattern);
  if (factor > 0) shown.non_whiteness = factor;
  std::vector<double> power = pattern.power;
  shorten(power, most_values, mean_of);
  // Scatter about a small pattern goes below zero, which has no amplitude.
  for (const double p : power) shown.amplitude_dn.push_back(std::sqrt(std::max(0.0, p)));
  return out;
}

}  // namespace

MeanFrameStatistics mean_frame_statistics(const MeanFrameInput& input,
                                          const MeanFrameStatisticsOptions& options) {
  assert(input.width > 0 && input.height > 0 && input.frames > 0 && input.noise_left_dn2 >= 0);
  assert(input.pixels.size() ==
         static_cast<std::size_t>(input.width) * static_cast<std::size_t>(input.height));
  MeanFrameStatistics out;
  out.high_pass = high_pass_variance(input, options.threads);
  if (!options.pictures) return out;
  MeanFrame& frame = out.pictures.emplace();
  frame.frames = input.frames;
  const Extent extent = add_profiles(input, options.most_values, frame);
  frame.mean_dn = input.level_dn + extent.mean;
  const ValueBins bins = input.continuous ? bins_of_range(extent.lowest, extent.highest)
                                          : bins_of_means(extent.lowest, extent.highest, input.frames);
  WhitePart rows;
  WhitePart columns;
  const std::array<std::function<void()>, 4> parts{
      [&] {
        frame.deviations = {0, bins.width, count_deviations(input.pixels, extent.mean, bins.width)};
      },
      [&] { rows = spectrogram_of(input, LineDirection::rows, options.most_values); },
      [&] { columns = spectrogram_of(input, LineDirection::columns, options.most_values); },
      [&] {
        frame.values = {input.level_dn + bins.first, bins.width, count_values(input.pixels, bins)};
      }};
  // Fails by an interrupt only, which the caller sees.
  (void)for_each_item(static_cast<int>(parts.size()), options.threads, [&](int part, int) -> Status {
    parts[static_cast<std::size_t>(part)]();
    return Done{};
  });
  frame.of_rows = std::move(rows.spectrogram);
  frame.of_columns = std::move(columns.spectrogram);
  std::optional<double> white = rows.with_noise_dn2;
  if (columns.with_noise_dn2 && (!white || *columns.with_noise_dn2 < *white)) white = columns.with_noise_dn2;
  frame.normal_dn = std::sqrt(std::max(0.0, white.value_or(0.0)));
  return out;
}

}  // namespace evenfield
