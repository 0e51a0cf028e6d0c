#include "analyse/series_summary.h"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace evenfield {
namespace {

/// Sums of one block about a level of choice.
struct BlockSums {
  double pixels = 0;
  std::vector<double> sum;     ///< [frame] of (y - level)
  std::vector<double> square;  ///< [frame] of (y - level)^2
  double total = 0;            ///< sum over frames and pixels of (y - level)
  double total_square = 0;     ///< sum over pixels of (sum over frames of (y - level))^2
};

/// Fills `out`, whose memory serves block after block.
const BlockSums& block_sums(
    const RegionStatistics& region, std::size_t block, int frames, double level, BlockSums& out) {
  out.sum.clear();
  out.square.clear();
  out.pixels = static_cast<double>(region.pixels[block]);
  const double shift = region.centre[block] - level;
  double raw_total = 0;
  for (const GroupStatistics& group : region.groups) {
    const auto size = static_cast<std::size_t>(group.frames);
    for (int f = 0; f < group.frames; ++f) {
      const double sum = group.sums[block * size + static_cast<std::size_t>(f)];
      const double square = group.squares[block * size + static_cast<std::size_t>(f)];
      raw_total += sum;
      out.sum.push_back(sum + out.pixels * shift);
      out.square.push_back(square + 2 * shift * sum + out.pixels * shift * shift);
    }
  }
  out.total = raw_total + frames * out.pixels * shift;
  out.total_square = region.total_square[block] + 2 * frames * shift * raw_total +
                     out.pixels * frames * frames * shift * shift;
  return out;
}

/// Sample variance.
double scatter(const std::vector<double>& values) {
  const double n = static_cast<double>(values.size());
  const double mean = std::accumulate(values.begin(), values.end(), 0.0) / n;
  double squares = 0;
  for (const double v : values) squares += (v - mean) * (v - mean);
  return squares / (n - 1);
}

/// Temporal variance shared by the pixels of a row: row means with the frame's and the row's own mean taken
/// out. And the variance of the rows' means over frames.
void find_row_noise(const RegionStatistics& region, double dark_level, RegionSummary& s) {
  const auto rows = static_cast<std::size_t>(region.rect.height);
  const auto frames = static_cast<std::size_t>(s.frames);
  const double width = region.rect.width;
  const auto value = [&](std::size_t f, std::size_t row) {
    const double mean = region.row_sums[f * rows + row] / width;
    return s.scaled ? (mean - dark_level) / s.scales[f] : mean - s.frame_means[f];
  };
  double squares = 0;
  double pair_squares = 0;
  std::vector<double> means;
  std::vector<double> change(rows);
  for (std::size_t f = 0; f + 1 < frames; ++f) {
    for (std::size_t row = 0; row < rows; ++row) change[row] = value(f, row) - value(f + 1, row);
    if (rows > 1) pair_squares += scatter(change) / 2;
  }
  if (rows > 1) s.row_pair_variance = pair_squares / static_cast<double>(frames - 1);
  for (std::size_t row = 0; row < rows; ++row) {
    double mean = 0;
    for (std::size_t f = 0; f < frames; ++f) mean += value(f, row);
    mean /= static_cast<double>(frames);
    for (std::size_t f = 0; f < frames; ++f) squares += (value(f, row) - mean) * (value(f, row) - mean);
    means.push_back(mean);
  }
  const double dof = static_cast<double>((rows - 1) * (frames - 1));
  s.row_noise_variance = dof > 0 ? squares / dof - *s.variance / width : 0.0;
  if (rows > 1) s.row_pattern_variance = scatter(means);
}

double population_variance(const std::vector<double>& values) {
  return values.size() > 1
             ? scatter(values) * static_cast<double>(values.size() - 1) / static_cast<double>(values.size())
             : 0.0;
}

/// Row and column means of the mean frame.
void find_line_means(const RegionStatistics& region, RegionSummary& s) {
  const auto rows = static_cast<std::size_t>(region.rect.height);
  std::vector<double> row_means(rows, 0.0);
  for (std::size_t f = 0; f < static_cast<std::size_t>(s.frames); ++f)
    for (std::size_t row = 0; row < rows; ++row)
      row_means[row] += region.row_sums[f * rows + row] / (static_cast<double>(region.rect.width) * s.frames);
  std::vector<double> column_means;
  for (const double sum : region.column_sums)
    column_means.push_back(sum / (static_cast<double>(region.rect.height) * s.frames));
  s.rows = region.rect.height;
  s.columns = region.rect.width;
  s.row_means_variance = population_variance(row_means);
  s.column_means_variance = population_variance(column_means);
}

}  // namespace

RegionSummary summarize(const RegionStatistics& region, std::optional<double> dark_level) {
  RegionSummary s;
  for (const GroupStatistics& group : region.groups) s.frames += group.frames;
  s.block_columns = region.columns;
  s.block_rows = region.rows;
  s.block_highest = region.highest;
  s.block_neighbours = region.neighbours;
  find_line_means(region, s);
  const std::size_t blocks = region.blocks();
  const auto frames = static_cast<std::size_t>(s.frames);

  BlockSums sums;
  s.frame_means.assign(frames, 0.0);
  for (std::size_t b = 0; b < blocks; ++b) {
    block_sums(region, b, s.frames, 0.0, sums);
    s.block_pixels.push_back(sums.pixels);
    s.block_mean.push_back(sums.total / (sums.pixels * s.frames));
    s.pixels += sums.pixels;
    for (std::size_t f = 0; f < frames; ++f) s.frame_means[f] += sums.sum[f];
    if (b == 0 || region.lowest[b].code < s.lowest.code) s.lowest = {region.lowest[b].code, 0};
    if (b == 0 || region.highest[b].code > s.highest.code) s.highest = {region.highest[b].code, 0};
  }
  for (std::size_t b = 0; b < blocks; ++b) {
    if (region.lowest[b].code == s.lowest.code) s.lowest.count += region.lowest[b].count;
    if (region.highest[b].code == s.highest.code) s.highest.count += region.highest[b].count;
  }
  for (double& mean : s.frame_means) mean /= s.pixels;
  s.mean = std::accumulate(s.frame_means.begin(), s.frame_means.end(), 0.0) / s.frames;
  for (const std::int64_t hits : region.frame_hits) s.hits += hits;
  s.scales.assign(frames, 1.0);

  // A scale is told from the frame means; where their own noise exceeds a per cent of the signal, offsets
  // serve better.
  double offset_squares = 0;
  for (std::size_t b = 0; b < blocks; ++b) {
    block_sums(region, b, s.frames, s.block_mean[b], sums);
    for (std::size_t f = 0; f < frames; ++f) offset_squares += sums.square[f];
    offset_squares -= sums.total_square / s.frames;
  }
  const double rough_variance =
      frames > 1 ? std::max(0.0, offset_squares) / (s.pixels * (s.frames - 1)) : 0.0;
  const double signal = dark_level ? s.mean - *dark_level : 0.0;
  s.scaled = dark_level && frames > 1 && signal > 100.0 * std::sqrt(rough_variance / s.pixels);
  if (s.scaled)
    for (std::size_t f = 0; f < frames; ++f) s.scales[f] = (s.frame_means[f] - *dark_level) / signal;
  s.scaled = s.scaled && *std::min_element(s.scales.begin(), s.scales.end()) > 0.1;
  if (!s.scaled) s.scales.assign(frames, 1.0);
  if (s.scaled) s.first_change = s.scales[1] - s.scales[0];

  double squares = 0;
  double spatial = 0;
  for (std::size_t b = 0; b < blocks; ++b) {
    double block = 0;
    if (s.scaled) {
      block_sums(region, b, s.frames, *dark_level, sums);
      for (std::size_t f = 0; f < frames; ++f) block += sums.square[f] / s.scales[f];
      block -= sums.total_square / s.frames;
    } else {
      block_sums(region, b, s.frames, s.block_mean[b], sums);
      for (std::size_t f = 0; f < frames; ++f) {
        const double offset = s.frame_means[f] - s.mean;
        block += sums.square[f] - 2 * offset * sums.sum[f] + sums.pixels * offset * offset;
      }
      block -= sums.total_square / s.frames;
    }
    // Frames that hold one code have no noise; sums of large numbers would leave some.
    if (region.lowest[b].code == region.highest[b].code) block = 0;
    s.block_squares.push_back(std::max(0.0, block));
    // Scales or offsets were taken from the region's own means, which costs F - 1 of all degrees of freedom.
    s.block_dof.push_back(s.block_pixels[b] * (s.frames - 1) * (1 - 1 / s.pixels) -
                          static_cast<double>(region.block_hits[b]));
    squares += s.block_squares.back();
    s.dof += s.block_dof.back();
    spatial += block_sums(region, b, s.frames, s.mean, sums).total_square;
    const double own = block_sums(region, b, s.frames, s.block_mean[b], sums).total_square;
    s.block_spread.push_back(std::sqrt(std::max(0.0, own) / s.block_pixels[b]) / s.frames);
  }
  if (frames > 1 && s.dof > 0) {
    s.variance = squares / s.dof;
    s.spatial_variance = spatial / (s.pixels * s.frames * s.frames) - *s.variance / s.frames;
    find_row_noise(region, dark_level.value_or(0.0), s);
    s.frame_mean_variance =
        scatter(s.frame_means) - *s.variance / s.pixels - std::max(0.0, *s.row_noise_variance) / s.rows;
  }
  return s;
}

}  // namespace evenfield
