#pragma once
// Loops over whole numbers of up to 16 bits that hold for any magnitude, for every machine: rare cells take
// them, and on machines without special instructions all do. Part of cell_kernel_loops.h; see there.
#include "accumulate/cell_workspace.h"

namespace {

inline void wide_sums(const CellInput& cell, const WholeWorkspace& work, WholeSums& sums) {
  for (int f = 0; f < cell.frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    std::int64_t squares = 0;
    for (int y = 0; y < cell.height; ++y, d += cell.width) {
      std::int32_t sum = 0;
      for (int x = 0; x < cell.width; ++x) {
        sum += d[x];
        squares += std::int32_t{d[x]} * std::int32_t{d[x]};
      }
      sums.rows[f][y] = sum;
    }
    sums.squares[f] = squares;
  }
}

inline void wide_across(const CellInput& cell, const int* mean, WholeWorkspace& work, WholeAcross& out) {
  const int pixels = cell.width * cell.height;
  std::int32_t* total = work.total.data();
  for (int f = 0; f < cell.frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p) total[p] = f == 0 ? d[p] : total[p] + d[p];
  }
  for (int f = 0; f < cell.frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    std::int64_t sum = 0;
    for (int p = 0; p < pixels; ++p) sum += static_cast<std::int64_t>(d[p]) * total[p];
    out.with_total[f] = sum;
  }
  int means = 0;
  for (int f = 0; f < cell.frames; ++f) means += mean[f];
  int widest = -0x7fffffff;  // of frames x highest deviation less their sum
  for (int p = 0; p < pixels; ++p) {
    int high = work.centred[0][static_cast<std::size_t>(p)] - mean[0];
    for (int f = 1; f < cell.frames; ++f) {
      const int e = work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)] - mean[f];
      high = e > high ? e : high;
    }
    const int above = cell.frames * high - total[p];
    widest = above > widest ? above : widest;
  }
  out.above_mean = static_cast<double>(widest + means) / cell.frames + kHiddenWide;
}

inline std::int64_t wide_count(const CellInput& cell, const WholeWorkspace& work, std::int16_t code) {
  const int pixels = cell.width * cell.height;
  std::int64_t total = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p) total += d[p] == code ? 1 : 0;
  }
  return total;
}

/// Sums of products of work.difference, behind which zeros lie, with itself 0, 1, width and width + 1 places
/// on.
inline void wide_lags(const WholeWorkspace& work,
                      int pixels,
                      int width,
                      std::int64_t (&sums)[kNeighbours + 1]) {
  const std::int16_t* d = work.difference.data();
  const int apart[kNeighbours + 1] = {0, 1, width, width + 1, width - 1};
  for (int k = 0; k <= kNeighbours; ++k) {
    std::int64_t sum = 0;
    for (int p = 0; p < pixels; ++p) sum += std::int32_t{d[p]} * std::int32_t{d[p + apart[k]]};
    sums[k] = sum;
  }
}

}  // namespace
