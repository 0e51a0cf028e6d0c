#pragma once
// Loops over integers of up to 16 bits, for every machine. Part of cell_kernel_loops.h; see there.
// cell_whole_avx2.h holds the same functions for machines that have AVX2; both give the same bits.
#include "accumulate/cell_workspace.h"

namespace {

/// Lowest and highest pixel; on the way the pixels' bits go into `work`, row by row without gaps, where all
/// that follows is close together.
template <class T>
Range<T> whole_gather(const CellInput& cell, Workspace<std::int16_t>& work) {
  Range<T> range{*row_of<T>(cell, 0, 0), *row_of<T>(cell, 0, 0)};
  for (int f = 0; f < cell.frames; ++f) {
    std::int16_t* to = work.centred[static_cast<std::size_t>(f)].data();
    for (int y = 0; y < cell.height; ++y, to += cell.width) {
      const T* row = row_of<T>(cell, f, y);
      T low = range.low;
      T high = range.high;
      for (int x = 0; x < cell.width; ++x) {
        low = row[x] < low ? row[x] : low;
        high = row[x] > high ? row[x] : high;
        to[x] = static_cast<std::int16_t>(row[x]);
      }
      range = {low, high};
    }
  }
  return range;
}

/// pixel - centre modulo 2^16, which is exact since the difference fits; zeros behind the pixels.
inline void whole_centre(int frames, int pixels, int centre, Workspace<std::int16_t>& work) {
  const auto shift = static_cast<std::uint16_t>(centre);
  for (int f = 0; f < frames; ++f) {
    std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p)
      d[p] = static_cast<std::int16_t>(static_cast<std::uint16_t>(static_cast<std::uint16_t>(d[p]) - shift));
    for (int p = pixels; p < padded(pixels); ++p) d[p] = 0;
  }
}

/// How many centred pixels are `code`.
inline std::int64_t whole_count(const Workspace<std::int16_t>& work,
                                int frames,
                                int pixels,
                                std::int16_t code) {
  std::int64_t total = 0;
  for (int f = 0; f < frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    std::uint16_t count = 0;  // at most 2048
    for (int p = 0; p < pixels; ++p) count = static_cast<std::uint16_t>(count + (d[p] == code ? 1 : 0));
    total += count;
  }
  return total;
}

/// Sums of the rows of one frame, at most 128 terms each.
inline void whole_row_sums(const std::int16_t* d, int width, int height, double, std::int32_t* sums) {
  for (int y = 0; y < height; ++y, d += width) {
    std::int32_t total = 0;
    for (int x = 0; x < width; ++x) total += d[x];
    sums[y] = total;
  }
}

/// Products of all pairs of frames, summed over `pixels` (padded); 32 bit sums run while they cannot
/// overflow.
inline void whole_gram(
    const Workspace<std::int16_t>& work, int frames, int pixels, double magnitude, std::int64_t* gram) {
  const int chunk = products_in_32_bits(magnitude);
  for (int i = 0; i < frames; ++i)
    for (int j = i; j < frames; ++j) {
      const std::int16_t* a = work.centred[static_cast<std::size_t>(i)].data();
      const std::int16_t* b = work.centred[static_cast<std::size_t>(j)].data();
      std::int64_t total = 0;
      for (int begin = 0; begin < pixels; begin += chunk) {
        const int end = begin + chunk < pixels ? begin + chunk : pixels;
        std::int32_t part = 0;
        for (int p = begin; p < end; ++p)
          part += static_cast<std::int32_t>(a[p]) * static_cast<std::int32_t>(b[p]);
        total += part;
      }
      gram[pair_index(i, j, frames)] = total;
    }
}

/// Largest range over frames of any pixel's deviation from `mean` of its frame; no less than 32767 where that
/// is exceeded.
inline int whole_deviation_range(const Workspace<std::int16_t>& work,
                                 int frames,
                                 int pixels,
                                 const int* mean) {
  int widest = 0;
  for (int p = 0; p < pixels; ++p) {
    int low = work.centred[0][static_cast<std::size_t>(p)] - mean[0];
    int high = low;
    for (int f = 1; f < frames; ++f) {
      const int e = work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)] - mean[f];
      low = e < low ? e : low;
      high = e > high ? e : high;
    }
    widest = high - low > widest ? high - low : widest;
  }
  return widest;
}

/// total = or += sum over frames of the centred pixels + shift.
inline void whole_add(const Workspace<std::int16_t>& work,
                      int frames,
                      int pixels,
                      double,
                      bool begin,
                      int shift,
                      std::int32_t* total) {
  for (int f = 0; f < frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    if (f == 0 && begin)
      for (int p = 0; p < pixels; ++p) total[p] = d[p] + shift;
    else if (f == 0)
      for (int p = 0; p < pixels; ++p) total[p] += d[p] + shift;
    else
      for (int p = 0; p < pixels; ++p) total[p] += d[p];
  }
}

/// Sum of squares of `count` totals of magnitude below 2^26.
inline std::int64_t whole_square(const std::int32_t* total, int count) {
  std::int64_t sum = 0;
  for (int p = 0; p < count; ++p) sum += static_cast<std::int64_t>(total[p]) * total[p];
  return sum;
}

}  // namespace
