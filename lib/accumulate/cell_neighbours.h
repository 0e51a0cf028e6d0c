#pragma once
// Do neighbours share their noise? Sums over the difference of the first two frames. Part of
// cell_kernel_loops.h; see there.
#include "accumulate/cell_real.h"

namespace {

/// Sums over pixels at the edges of a cell and over all.
template <class Sum>
struct EdgeSums {
  Sum all = 0, first_row = 0, last_row = 0, first_column = 0, last_column = 0;
};

/// All but the sum over all pixels.
template <class C, class Sum>
void sum_edges(const CellInput& cell, const C* d, EdgeSums<Sum>& out) {
  const C* last = d + (cell.height - 1) * cell.width;
  for (int x = 0; x < cell.width; ++x) {
    out.first_row += d[x];
    out.last_row += last[x];
  }
  for (int y = 0; y < cell.height; ++y) {
    out.first_column += d[y * cell.width];
    out.last_column += d[y * cell.width + cell.width - 1];
  }
}

/// Products that run from the end of one row to the begin of a later one, which are no neighbours.
template <class Product, class C>
Product across_end(const CellInput& cell, const C* d, int rows_on) {
  Product sum = 0;
  for (int y = 0; y + rows_on < cell.height; ++y)
    sum += static_cast<Product>(d[y * cell.width + cell.width - 1]) *
           static_cast<Product>(d[(y + rows_on) * cell.width]);
  return sum;
}

/// `lags`: sums of products of the difference, with zeros behind it, with itself 0, 1, width, width + 1 and
/// width - 1
/// places on.
template <class C, class Product, class Sum>
NeighbourSums neighbour_sums(const CellInput& cell,
                             const C* d,
                             const Product (&lags)[kNeighbours + 1],
                             const EdgeSums<Sum>& edges) {
  const int w = cell.width;
  const int h = cell.height;
  const double n = w * h;
  // Down to the left, products that run from the first pixel of a row end at the last of the same row.
  Product along = 0;
  for (int y = 0; y < h; ++y)
    along += static_cast<Product>(d[y * w]) * static_cast<Product>(d[y * w + w - 1]);
  const Product products[kNeighbours] = {lags[1] - across_end<Product>(cell, d, 1), lags[2],
                                         lags[3] - across_end<Product>(cell, d, 2), lags[4] - along};
  // Sums over the pixels that begin a pair, plus those over the pixels that end one.
  const Sum other_corners = static_cast<Sum>(d[(h - 1) * w]) + static_cast<Sum>(d[w - 1]);
  const Sum corners = static_cast<Sum>(d[0]) + static_cast<Sum>(d[w * h - 1]);
  const Sum diagonal =
      2 * edges.all - edges.last_row - edges.last_column - edges.first_row - edges.first_column;
  const Sum ends[kNeighbours] = {2 * edges.all - edges.last_column - edges.first_column,
                                 2 * edges.all - edges.last_row - edges.first_row, diagonal + corners,
                                 diagonal + other_corners};
  NeighbourSums out;
  const double mean = static_cast<double>(edges.all) / n;
  const double square = static_cast<double>(lags[0]) - mean * static_cast<double>(edges.all);
  const double variance = n > 1 ? square / (n - 1) : 0.0;
  out.pixels = std::int64_t{w} * h;
  out.cells = 1;
  out.square = n * variance;
  const std::int64_t diagonals = std::int64_t{w - 1} * (h - 1);
  out.pairs = {std::int64_t{w - 1} * h, std::int64_t{w} * (h - 1), diagonals, diagonals};
  for (int k = 0; k < kNeighbours; ++k) {
    const auto i = static_cast<std::size_t>(k);
    const auto pairs = static_cast<double>(out.pairs[i]);
    // Taking out the cell's own mean costs each pair the variance of that mean.
    out.products[i] = static_cast<double>(products[k]) - mean * static_cast<double>(ends[k]) +
                      pairs * mean * mean + pairs * variance / n;
  }
  return out;
}

/// Puts the difference, `shift` taken out, where it belongs, and returns its largest size. One that 16 bits
/// do not hold is cut: only made-up frames have it.
inline int put_difference(WholeWorkspace& work, int pixels, int shift, double magnitude) {
  std::int16_t* d = work.difference.data();
  const std::int16_t* first = work.centred[0].data();
  const std::int16_t* second = work.centred[1].data();
  std::int16_t low = 0;
  std::int16_t high = 0;
  const auto put = [&](int p, auto value) {
    const auto cut = static_cast<std::int16_t>(value);
    low = cut < low ? cut : low;
    high = cut > high ? cut : high;
    d[p] = cut;
  };
  if (magnitude <= kNarrow) {
    const auto narrow = static_cast<std::int16_t>(shift);
    for (int p = 0; p < pixels; ++p) put(p, static_cast<std::int16_t>(second[p] - first[p] - narrow));
  } else {
    for (int p = 0; p < pixels; ++p) {
      const int value = second[p] - first[p] - shift;
      put(p, value < -32767 ? -32767 : value > 32767 ? 32767 : value);
    }
  }
  return -low > high ? -low : high;
}

/// The sums run fast where no difference exceeds kNarrow, as nearly everywhere.
inline NeighbourSums whole_neighbours(const CellInput& cell,
                                      double magnitude,
                                      const CellStatistics& s,
                                      WholeWorkspace& work) {
  const int pixels = cell.width * cell.height;
  const std::int16_t* d = work.difference.data();
  const int shift = static_cast<int>(std::floor((s.sums[1] - s.sums[0]) / pixels + 0.5));
  const int largest = put_difference(work, pixels, shift, magnitude);
  for (int p = pixels; p < pixels + cell.width + kPadding; ++p)
    work.difference[static_cast<std::size_t>(p)] = 0;
  EdgeSums<std::int64_t> edges;
  if (largest < 32767)
    edges.all = static_cast<std::int64_t>(s.sums[1] - s.sums[0]) - std::int64_t{shift} * pixels;
  else
    for (int p = 0; p < pixels; ++p) edges.all += d[p];
  std::int64_t lags[kNeighbours + 1];
  if (largest <= kNarrow)
    whole_lags(work, pixels, cell.width, lags);
  else
    wide_lags(work, pixels, cell.width, lags);
  EdgeSums<std::int32_t> outer;
  sum_edges(cell, d, outer);
  edges = {edges.all, outer.first_row, outer.last_row, outer.first_column, outer.last_column};
  return neighbour_sums(cell, d, lags, edges);
}

inline NeighbourSums real_neighbours(const CellInput& cell, const CellStatistics& s, RealWorkspace& work) {
  const int pixels = cell.width * cell.height;
  double* d = work.difference.data();
  const double shift = (s.sums[1] - s.sums[0]) / pixels;
  for (int p = 0; p < pixels; ++p)
    d[p] =
        work.centred[1][static_cast<std::size_t>(p)] - work.centred[0][static_cast<std::size_t>(p)] - shift;
  for (int p = pixels; p < pixels + cell.width + kPadding; ++p) d[p] = 0;
  EdgeSums<double> edges;
  edges.all = real_sum(d, pixels);
  sum_edges(cell, d, edges);
  const int w = cell.width;
  const double lags[kNeighbours + 1] = {real_dot(d, d, pixels), real_dot(d, d + 1, pixels),
                                        real_dot(d, d + w, pixels), real_dot(d, d + w + 1, pixels),
                                        real_dot(d, d + w - 1, pixels)};
  return neighbour_sums(cell, d, lags, edges);
}

}  // namespace
