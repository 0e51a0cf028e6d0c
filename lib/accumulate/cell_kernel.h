#pragma once
/// The inner loops: statistics of one cell of one group of frames, while its pixels are in cache.

#include <array>
#include <cstddef>
#include <cstdint>
#include <limits>

#include "accumulate/geometry.h"
#include "accumulate/series_statistics.h"

namespace evenfield {

/// So many bytes behind the last pixel of a cell may be read, whatever they are.
inline constexpr std::size_t kReadBeyond = 128;

/// One cell in the frames of one group; rows of a frame are `stride` pixels apart. `pixels` are of the type
/// that the kernel was chosen for.
struct CellInput {
  std::array<const void*, kGroupFrames> pixels{};
  std::ptrdiff_t stride = 0;
  int frames = 0;
  int width = 0;
  int height = 0;
  bool first_group = true;   ///< the totals are begun, not continued; neighbours are looked at
  bool last_group = true;    ///< the totals are complete: CellSquares is filled
  double hit_threshold = 0;  ///< in standard deviations; 0: hits are not looked for
  /// Codes that occur elsewhere, in the region or in the block; extremes inside them are not counted.
  double known_lowest = std::numeric_limits<double>::infinity();
  double known_highest = -std::numeric_limits<double>::infinity();
};

struct CellStatistics {
  double centre = 0;
  std::array<double, kGroupFrames> sums{};        ///< of y - centre
  std::array<double, kGroupFrames> squares{};     ///< of (y - centre)^2
  std::array<double, kGroupFrames> with_total{};  ///< of (y - centre) x (its sum over the group)
  std::array<double, kGroupFrames * std::size_t{kCellRows}> row_sums{};  ///< [frame][row] of y - centre
  std::array<std::int32_t, kGroupFrames> hits{};
  Extreme lowest, highest;  ///< count 0: not counted, since the block goes further
  CodeBits bits;
  NeighbourSums neighbours;  ///< of the first two frames, in the first group
  int bad_frame = -1;        ///< a frame with a pixel that is not a finite number; nothing else is valid then
};

/// Sums over the frames of the groups seen so far, pixel by pixel of the cell, row by row without gaps. Not
/// used where a series is one group.
struct CellTotals {
  double centre = 0;                            ///< of the first group
  double magnitude = 0;                         ///< no total is larger
  std::array<std::int32_t, kCellPixels> whole;  ///< for integer pixels of up to 16 bits
  std::array<double, kCellPixels> real;         ///< for all others
};

/// Of the sums over all frames of y - `centre`.
struct CellSquares {
  double centre = 0;
  double square = 0;                               ///< sum over pixels of total^2
  double sum = 0;                                  ///< sum over pixels of total
  std::array<double, kCellColumns> column_sums{};  ///< sum over rows of total
};

struct CellKernels {
  /// `workspace`: of workspace_bytes, aligned to 64; what is in it does not matter.
  void (*measure)(const CellInput&, CellTotals&, void* workspace, CellStatistics&, CellSquares&);
  std::size_t workspace_bytes;
  /// XXH3-128 of a row, seeded by its number, low and high word.
  std::array<std::uint64_t, 2> (*hash)(const void* row, std::size_t bytes, std::uint64_t seed);
};

/// The kernels for pixels of `type` on this machine; `portable` leaves special instructions unused. Both give
/// the same bits.
CellKernels cell_kernels(PixelType type, bool portable = false);

}  // namespace evenfield
