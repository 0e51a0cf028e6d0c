#pragma once
// What the loops of one cell work in. Part of cell_kernel_loops.h; see there.
#include <cmath>
#include <type_traits>

#include "accumulate/cell_kernel.h"

namespace {

using namespace evenfield;

/// Integer pixels of up to 16 bits are centred into 16 bits: the middle of the cell's range as centre always
/// fits.
template <class T>
constexpr bool kWhole = std::is_integral_v<T> && sizeof(T) <= 2;
template <class T>
using Centred = std::conditional_t<kWhole<T>, std::int16_t, double>;

/// Centred pixels, row by row without gaps. Whole numbers are followed by zeros up to a multiple of kPadding.
inline constexpr int kPadding = 32;
template <class C>
struct Workspace {
  alignas(64) std::array<std::array<C, kCellPixels + kPadding>, kGroupFrames> centred;
  alignas(64) std::array<double, kCellPixels> squares;  ///< temporal, of each pixel; see cell_hits.h
  alignas(64) std::array<double, kCellPixels> scratch;
};

inline int padded(int pixels) { return (pixels + kPadding - 1) / kPadding * kPadding; }

template <class T>
struct Range {
  T low;
  T high;
};

template <class T>
const T* row_of(const CellInput& cell, int frame, int y) {
  return static_cast<const T*>(cell.pixels[static_cast<std::size_t>(frame)]) + y * cell.stride;
}

/// Largest number of products |d|^2 that fit a 32 bit sum.
inline int products_in_32_bits(double magnitude) {
  const double products = 2147483647.0 / (magnitude < 1 ? 1 : magnitude * magnitude);
  return products < kCellPixels ? static_cast<int>(products) : static_cast<int>(kCellPixels);
}

}  // namespace
