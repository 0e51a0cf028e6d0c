#pragma once
// Loops over cells that 16 bits do not hold, in double precision. Part of cell_kernel_loops.h; see there.
// Partial sums run in eight lanes, in a fixed order, so that every instruction set gives the same bits and a
// compiler may use its vectors.
#include "accumulate/cell_workspace.h"

namespace {

inline constexpr int kParts = 8;

inline double sum_of_parts(const double (&part)[kParts]) {
  return ((part[0] + part[1]) + (part[2] + part[3])) + ((part[4] + part[5]) + (part[6] + part[7]));
}

inline double real_sum(const double* a, int count) {
  double part[kParts] = {};
  int i = 0;
  for (; i + kParts <= count; i += kParts)
    for (int k = 0; k < kParts; ++k) part[k] += a[i + k];
  for (int k = 0; i < count; ++i, ++k) part[k] += a[i];
  return sum_of_parts(part);
}

inline double real_dot(const double* a, const double* b, int count) {
  double part[kParts] = {};
  int i = 0;
  for (; i + kParts <= count; i += kParts)
    for (int k = 0; k < kParts; ++k) part[k] += a[i + k] * b[i + k];
  for (int k = 0; i < count; ++i, ++k) part[k] += a[i] * b[i];
  return sum_of_parts(part);
}

struct RealRange {
  double low = 0;
  double high = 0;
};

/// Extremes of a row, and whether all of it is finite, in eight lanes of the pixels' own type.
template <class T>
struct RealLanes {
  T low[kParts], high[kParts];
  T nothing[kParts] = {};  // v - v is 0, or not a number where v is not finite

  explicit RealLanes(T first) {
    for (int k = 0; k < kParts; ++k) low[k] = high[k] = first;
  }
  void look(const T* row, int width) {
    // Copies: the row might lie where the lanes do, as far as a compiler knows.
    T l[kParts], h[kParts], n[kParts];
    for (int k = 0; k < kParts; ++k) {
      l[k] = low[k];
      h[k] = high[k];
      n[k] = nothing[k];
    }
    int x = 0;
    for (; x + kParts <= width; x += kParts) {
      for (int k = 0; k < kParts; ++k) {
        const T v = row[x + k];
        l[k] = v < l[k] ? v : l[k];
        h[k] = v > h[k] ? v : h[k];
        n[k] += v - v;
      }
    }
    for (int k = 0; x < width; ++x, ++k) {
      l[k] = row[x] < l[k] ? row[x] : l[k];
      h[k] = row[x] > h[k] ? row[x] : h[k];
      n[k] += row[x] - row[x];
    }
    for (int k = 0; k < kParts; ++k) {
      low[k] = l[k];
      high[k] = h[k];
      nothing[k] = n[k];
    }
  }
};

/// Centres the pixels of all frames; false if one is not finite.
template <class T>
bool real_gather(const CellInput& cell, double centre, RealWorkspace& work, RealRange& range) {
  RealLanes<T> lanes(*row_of<T>(cell, 0, 0));
  for (int f = 0; f < cell.frames; ++f) {
    double* to = work.centred[static_cast<std::size_t>(f)].data();
    for (int y = 0; y < cell.height; ++y, to += cell.width) {
      const T* row = row_of<T>(cell, f, y);
      lanes.look(row, cell.width);
      for (int x = 0; x < cell.width; ++x) to[x] = static_cast<double>(row[x]) - centre;
    }
  }
  range = {static_cast<double>(lanes.low[0]), static_cast<double>(lanes.high[0])};
  bool finite = true;
  for (int k = 0; k < kParts; ++k) {
    const auto low = static_cast<double>(lanes.low[k]);
    const auto high = static_cast<double>(lanes.high[k]);
    range.low = low < range.low ? low : range.low;
    range.high = high > range.high ? high : range.high;
    finite = finite && lanes.nothing[k] == T{0};
  }
  return finite;
}

/// The first frame with a pixel that is not finite, or -1.
template <class T>
int frame_not_finite(const CellInput& cell) {
  for (int f = 0; f < cell.frames; ++f)
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (!std::isfinite(static_cast<double>(row_of<T>(cell, f, y)[x]))) return f;
  return -1;
}

/// Whether the first frame of the cell holds whole numbers, whatever their type: the same frames in another
/// container are then treated alike.
template <class T>
bool holds_whole_codes(const CellInput& cell) {
  if constexpr (std::is_floating_point_v<T>) {
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (row_of<T>(cell, 0, y)[x] != std::floor(row_of<T>(cell, 0, y)[x])) return false;
  }
  return true;
}

inline void real_sums(const CellInput& cell, const RealWorkspace& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    const double* d = work.centred[k].data();
    double* rows = out.row_sums.data() + f * kCellRows;
    double total = 0;
    for (int y = 0; y < cell.height; ++y) total += rows[y] = real_sum(d + y * cell.width, cell.width);
    out.sums[k] = total;
    out.squares[k] = real_dot(d, d, pixels);
  }
}

/// Totals and all sums across frames; returns how far above its mean over the frames no pixel's highest frame
/// is, each frame's mean taken out.
inline double real_across(const CellInput& cell, RealWorkspace& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  double* total = work.total.data();
  double* high = work.scratch.data();
  double means = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    const double* d = work.centred[k].data();
    const double mean = out.sums[k] / pixels;
    means += mean;
    if (f == 0) {
      for (int p = 0; p < pixels; ++p) {
        total[p] = d[p];
        high[p] = d[p] - mean;
      }
      continue;
    }
    for (int p = 0; p < pixels; ++p) {
      const double e = d[p] - mean;
      total[p] += d[p];
      high[p] = e > high[p] ? e : high[p];
    }
  }
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    out.with_total[k] = real_dot(work.centred[k].data(), total, pixels);
  }
  double most[kParts] = {};
  const auto look = [&](int p, int k) {
    const double above = high[p] - (total[p] - means) / cell.frames;
    most[k] = above > most[k] ? above : most[k];
  };
  int p = 0;
  for (; p + kParts <= pixels; p += kParts)
    for (int k = 0; k < kParts; ++k) look(p + k, k);
  for (int k = 0; p < pixels; ++p, ++k) look(p, k);
  double above_mean = 0;
  for (const double above : most) above_mean = above > above_mean ? above : above_mean;
  return above_mean;
}

inline std::int64_t real_count(const CellInput& cell, const RealWorkspace& work, double code) {
  const int pixels = cell.width * cell.height;
  std::int64_t total = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const double* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p) total += d[p] == code ? 1 : 0;
  }
  return total;
}

}  // namespace
