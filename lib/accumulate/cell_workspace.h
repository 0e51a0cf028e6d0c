#pragma once
// What the loops of one cell work in. Part of cell_kernel_loops.h; see there.
#include <cmath>
#include <type_traits>

#include "accumulate/cell_kernel.h"

namespace {

using namespace evenfield;

/// Types whose pixels always fit 16 bits once the middle of the cell's range is taken out.
template <class T>
constexpr bool kShort = std::is_integral_v<T> && sizeof(T) <= 2;

/// Pixels less the cell's centre, row by row without gaps: 16 bit integers wherever the cell holds whole
/// numbers that fit them, whatever type they are stored in, and doubles elsewhere. Whole numbers are followed
/// by zeros.
inline constexpr int kPadding = 32;
template <class C>
struct Workspace {
  alignas(64) std::array<std::array<C, kCellPixels + kPadding>, kGroupFrames> centred;
  /// Sum over the frames of the group, pixel by pixel.
  alignas(64) std::array<std::conditional_t<std::is_same_v<C, double>, double, std::int32_t>,
                         kCellPixels + kPadding> total;
  /// Second frame less the first; zeros behind, as far as a neighbour may lie.
  alignas(64) std::array<C, kCellPixels + kCellColumns + kPadding> difference;
  alignas(64) std::array<double, kCellPixels> squares;  ///< temporal, of each pixel; see cell_hits.h
  alignas(64) std::array<double, kCellPixels> scratch;
};
using WholeWorkspace = Workspace<std::int16_t>;
using RealWorkspace = Workspace<double>;

/// Magnitude of centred pixels up to which sums run narrow: 8 of them fit 16 bits, products of a whole
/// cell 32.
inline constexpr int kNarrow = 4095;

/// What one look at a cell of whole numbers gives.
struct WholeRange {
  std::int64_t low = 0;
  std::int64_t high = 0;
  CodeBits bits;
  bool whole = true;  ///< all pixels are whole numbers of 32 bits; nothing else is valid if not
};

/// Sums of the centred pixels of each frame.
struct WholeSums {
  std::int32_t rows[kGroupFrames][kCellRows];
  std::int64_t squares[kGroupFrames];
};

/// What a look through the frames gives.
struct WholeAcross {
  std::int64_t with_total[kGroupFrames];  ///< sum over pixels of pixel x total
  double above_mean =
      0;  ///< no pixel's highest frame is farther above its mean over the frames, each frame's mean taken out
};

/// round(a b / 2^15), as processors have it.
inline int scaled_product(int a, int b) { return (a * b + (1 << 14)) >> 15; }

/// What rounding may hide from WholeAcross::above_mean: the means of frames, and in narrow cells the mean
/// over frames.
inline constexpr double kHiddenWide = 1;
inline constexpr double kHiddenNarrow = 2;

inline int narrow_share(int frames) { return frames < 2 ? 32767 : (32768 + frames / 2) / frames; }
inline double narrow_above(int widest, int means, int frames) {
  return widest + static_cast<double>(means) / frames + kHiddenNarrow;
}

template <class T>
const T* row_of(const CellInput& cell, int frame, int y) {
  return static_cast<const T*>(cell.pixels[static_cast<std::size_t>(frame)]) + y * cell.stride;
}

/// `value` as a whole number of 32 bits, signed or as wide as T is; false if it is none.
template <class T>
bool whole_number(T value, std::int64_t& out) {
  if constexpr (std::is_floating_point_v<T>) {
    if (!(value >= T{-2147483648.0} && value < T{2147483648.0})) return false;
    out = static_cast<std::int64_t>(value);
    return static_cast<T>(out) == value;
  } else {
    out = value;
    return true;
  }
}

}  // namespace
