#pragma once
// Loops over whole numbers that fit 16 bits once centred, for every machine. Part of cell_kernel_loops.h; see
// there. cell_whole_avx2.h holds the same functions for machines that have AVX2; both give the same bits.
#include "accumulate/cell_whole_wide.h"

namespace {

/// Centres the pixels of all frames into `work`, with all sums that one frame alone gives. The sums are right
/// where no centred pixel exceeds kNarrow, the pixels where none exceeds 16 bits; WholeRange tells.
template <class T>
WholeRange whole_gather(const CellInput& cell, std::int64_t centre, WholeWorkspace& work, WholeSums& sums) {
  // The narrowest type that holds the codes, or the loops below would not be vectorized.
  using Code = std::conditional_t<std::is_floating_point_v<T>, std::int32_t, T>;
  using Bits = std::make_unsigned_t<Code>;
  bool whole = true;
  std::int64_t first = 0;
  whole = whole_number(*row_of<T>(cell, 0, 0), first);
  auto low = static_cast<Code>(first);
  Code high = low;
  auto any = static_cast<Bits>(low);
  Bits all = any;
  const auto shift = static_cast<std::uint32_t>(centre);
  for (int f = 0; f < cell.frames; ++f) {
    std::int16_t* to = work.centred[static_cast<std::size_t>(f)].data();
    std::int64_t squares = 0;
    for (int y = 0; y < cell.height; ++y, to += cell.width) {
      const T* row = row_of<T>(cell, f, y);
      for (int x = 0; x < cell.width; ++x) {
        Code code;
        if constexpr (std::is_floating_point_v<T>) {
          const bool fits = row[x] >= T{-2147483648.0} && row[x] < T{2147483648.0};
          code = static_cast<Code>(fits ? row[x] : T{0});
          whole = whole && static_cast<T>(code) == row[x];
        } else {
          code = row[x];
        }
        low = code < low ? code : low;
        high = code > high ? code : high;
        any = static_cast<Bits>(any | static_cast<Bits>(code));
        all = static_cast<Bits>(all & static_cast<Bits>(code));
        to[x] = static_cast<std::int16_t>(static_cast<std::uint32_t>(code) - shift);
      }
      std::int32_t sum = 0;
      std::uint32_t square = 0;
      for (int x = 0; x < cell.width; ++x) {
        sum += to[x];
        square += static_cast<std::uint32_t>(std::int32_t{to[x]} * std::int32_t{to[x]});
      }
      sums.rows[f][y] = sum;
      squares += square;
    }
    for (int i = 0; i < kPadding; ++i) to[i] = 0;
    sums.squares[f] = squares;
  }
  return {low,
          high,
          {true, static_cast<std::uint64_t>(std::int64_t{static_cast<Code>(any)}),
           static_cast<std::uint64_t>(std::int64_t{static_cast<Code>(all)})},
          whole};
}

/// Totals and all sums across frames. Up to kNarrow the mean over frames is rounded, as sixteen bits at a
/// time have it.
inline void whole_across(
    const CellInput& cell, const int* mean, int magnitude, WholeWorkspace& work, WholeAcross& out) {
  wide_across(cell, mean, work, out);
  if (magnitude > kNarrow) return;
  const int pixels = cell.width * cell.height;
  const int share = narrow_share(cell.frames);
  int means = 0;
  for (int f = 0; f < cell.frames; ++f) means += mean[f];
  int widest = -0x7fffffff;
  for (int p = 0; p < pixels; ++p) {
    int high = work.centred[0][static_cast<std::size_t>(p)] - mean[0];
    for (int f = 1; f < cell.frames; ++f) {
      const int e = work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)] - mean[f];
      high = e > high ? e : high;
    }
    const int above = high - scaled_product(work.total[static_cast<std::size_t>(p)], share);
    widest = above > widest ? above : widest;
  }
  out.above_mean = narrow_above(widest, means, cell.frames);
}

/// How many centred pixels are `code`.
inline std::int64_t whole_count(const CellInput& cell, const WholeWorkspace& work, std::int16_t code) {
  return wide_count(cell, work, code);
}

/// Sum of squares of `count` totals of magnitude below 2^26.
inline std::int64_t whole_square(const std::int32_t* total, int count) {
  std::int64_t sum = 0;
  for (int p = 0; p < count; ++p) sum += static_cast<std::int64_t>(total[p]) * total[p];
  return sum;
}

/// wide_lags where no difference exceeds kNarrow.
inline void whole_lags(const WholeWorkspace& work,
                       int pixels,
                       int width,
                       std::int64_t (&sums)[kNeighbours + 1]) {
  wide_lags(work, pixels, width, sums);
}

}  // namespace
