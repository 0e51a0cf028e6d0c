#include "analyse/resampling.h"

namespace evenfield {

int unit_count(const RegionSummary& summary, ResamplingUnit unit) {
  return unit == ResamplingUnit::bands ? summary.block_rows : summary.block_rows * summary.block_columns;
}

UnitSums::UnitSums(const RegionSummary& summary, ResamplingUnit unit)
    : units_(static_cast<std::size_t>(unit_count(summary, unit))) {
  const auto columns = static_cast<std::size_t>(summary.block_columns);
  for (std::size_t b = 0; b < summary.block_mean.size(); ++b) {
    Sums& sums = units_[unit == ResamplingUnit::bands ? b / columns : b];
    for (Sums* each : {&sums, &all_}) {
      each->pixels += summary.block_pixels[b];
      each->sum += summary.block_mean[b] * summary.block_pixels[b];
      each->squares += summary.block_squares[b];
      each->dof += summary.block_dof[b];
      if (b >= summary.block_neighbours.size()) continue;
      const NeighbourSums& neighbours = summary.block_neighbours[b];
      each->pair_pixels += static_cast<double>(neighbours.pixels);
      each->cells += static_cast<double>(neighbours.cells);
      for (std::size_t k = 0; k < kNeighbours; ++k) {
        each->pairs[k] += static_cast<double>(neighbours.pairs[k]);
        each->products[k] += neighbours.products[k];
      }
    }
  }
}

UnitSums::Sums UnitSums::without(int left_out) const {
  if (left_out < 0) return all_;
  const Sums& out = units_[static_cast<std::size_t>(left_out)];
  Sums rest{all_.pixels - out.pixels,
            all_.sum - out.sum,
            all_.squares - out.squares,
            all_.dof - out.dof,
            all_.pair_pixels - out.pair_pixels,
            all_.cells - out.cells,
            {},
            {}};
  for (std::size_t k = 0; k < kNeighbours; ++k) {
    rest.pairs[k] = all_.pairs[k] - out.pairs[k];
    rest.products[k] = all_.products[k] - out.products[k];
  }
  return rest;
}

double UnitSums::mean(int left_out) const {
  const Sums sums = without(left_out);
  return sums.sum / sums.pixels;
}

double UnitSums::variance(int left_out) const {
  const Sums sums = without(left_out);
  return sums.dof > 0 ? sums.squares / sums.dof : 0.0;
}

double UnitSums::dof(int left_out) const { return without(left_out).dof; }

double UnitSums::neighbour_covariance(int left_out) const {
  const Sums sums = without(left_out);
  // A pixel has two neighbours in its row, two in its column, two on each diagonal; the difference of two
  // frames has twice the covariance of one.
  constexpr double kCount = 2;
  double sum = 0;
  for (std::size_t k = 0; k < kNeighbours; ++k)
    if (sums.pairs[k] > 0) sum += kCount * sums.products[k] / sums.pairs[k] / 2;
  // The mean that each cell lost varies by (variance + sum) / pixels, of which the variance's part is made
  // good already; it is missing in each of the eight.
  constexpr double kEight = 8;
  const double pixels_of_cell = sums.cells > 0 ? sums.pair_pixels / sums.cells : 0.0;
  return pixels_of_cell > kEight ? sum / (1 - kEight / pixels_of_cell) : sum;
}

double UnitSums::neighbour_pixels(int left_out) const { return without(left_out).pair_pixels; }

}  // namespace evenfield
