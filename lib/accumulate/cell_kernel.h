#pragma once
/// The inner loops: statistics of one cell of one group of frames, while its pixels are in cache.

#include <array>
#include <cstddef>
#include <cstdint>
#include <limits>

#include "accumulate/geometry.h"
#include "accumulate/series_statistics.h"

namespace evenfield {

inline constexpr std::size_t kCellPixels = static_cast<std::size_t>(kCellRows) * kCellColumns;

/// One cell in the frames of one group; rows of a frame are `stride` pixels apart. `pixels` are of the type
/// that the kernel was chosen for.
struct CellInput {
  std::array<const void*, kGroupFrames> pixels{};
  std::ptrdiff_t stride = 0;
  int frames = 0;
  int width = 0;
  int height = 0;
  bool first_group = true;   ///< the totals are begun, not continued
  double hit_threshold = 0;  ///< in standard deviations; 0: hits are not looked for
  /// Codes that occur elsewhere in the block; extremes inside them are not counted.
  double known_lowest = std::numeric_limits<double>::infinity();
  double known_highest = -std::numeric_limits<double>::infinity();
};

struct CellStatistics {
  double centre = 0;
  std::array<double, kGroupFrames> sums{};  ///< of y - centre
  std::array<double, pair_count(kGroupFrames)> gram{};
  std::array<double, kGroupFrames * std::size_t{kCellRows}> row_sums{};  ///< [frame][row] of y - centre
  std::array<std::int32_t, kGroupFrames> hits{};
  Extreme lowest, highest;  ///< count 0: not counted, since the block goes further
  int bad_frame = -1;       ///< a frame with a pixel that is not a finite number; nothing else is valid then
};

/// Sums over the frames seen so far, pixel by pixel of the cell, row by row without gaps.
struct CellTotals {
  double centre = 0;                            ///< of the first group
  double magnitude = 0;                         ///< no total is larger
  std::array<std::int32_t, kCellPixels> whole;  ///< for integer pixels of up to 16 bits
  std::array<double, kCellPixels> real;         ///< for all others
};

struct CellSquares {
  double square = 0;                               ///< sum over pixels of total^2
  double sum = 0;                                  ///< sum over pixels of total
  std::array<double, kCellColumns> column_sums{};  ///< sum over rows of total
};

struct CellKernels {
  void (*measure)(const CellInput&, CellTotals&, CellStatistics&);
  void (*square)(const CellTotals&, int width, int height, CellSquares&);
  /// XXH3-128 of a row, seeded by its number, low and high word.
  std::array<std::uint64_t, 2> (*hash)(const void* row, std::size_t bytes, std::uint64_t seed);
};

/// The kernels for pixels of `type` on this machine; `portable` leaves special instructions unused. Both give
/// the same bits.
CellKernels cell_kernels(PixelType type, bool portable = false);

}  // namespace evenfield
