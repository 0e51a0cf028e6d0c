#pragma once
/// Everything that the analysis needs to know of one series of frames, in sums. The value that `accumulate`
/// makes.
///
/// A region is divided into blocks (columns x rows of them, row by row). Frames are taken in balanced groups
/// of at most eight. All sums of a block are of pixel - centre, with one constant centre per block; sums of
/// integer pixels of up to 16 bits are exact integers as long as they stay below 2^53. A pixel that was set
/// aside as a hit is replaced, in the frame that was hit, by the mean of that pixel in the other frames of
/// its group, before anything is summed; each costs one degree of freedom of the temporal variance.

#include <array>
#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

#include "base/image.h"

namespace evenfield {

inline constexpr int kGroupFrames = 8;

/// A group of consecutive frames.
struct GroupStatistics {
  int first_frame = 0;
  int frames = 0;
  std::vector<double> sums;     ///< [block][frame of the group]: sum over pixels of (y - centre)
  std::vector<double> squares;  ///< [block][frame]: sum over pixels of (y - centre)^2
  /// [block][frame]: sum over pixels of (y - centre) x (sum over the frames of the group of (y - centre)).
  std::vector<double> with_total;
};

/// An extreme code and how many samples have it.
struct Extreme {
  double code = 0;
  std::int64_t count = 0;
};

/// Bits of the codes that occur, negative ones as two's complement of 64 bits. Not valid where a pixel is no
/// whole number, or a cell spans more than 65535 codes.
struct CodeBits {
  bool valid = false;
  std::uint64_t any = 0;  ///< set in some code
  std::uint64_t all = 0;  ///< set in every code
};

/// Neighbours in a row, in a column, and along the diagonals down to the right and down to the left.
inline constexpr int kNeighbours = 4;

/// Of the difference of the first two frames, each cell's mean taken out: square / pixels estimates its
/// variance without bias, products / pairs its covariance between neighbours, without bias where that is
/// small. Pairs lie inside cells.
struct NeighbourSums {
  std::int64_t pixels = 0;
  std::int64_t cells = 0;
  double square = 0;
  std::array<std::int64_t, kNeighbours> pairs{};
  std::array<double, kNeighbours> products{};
};

struct RegionStatistics {
  Rect rect;
  int columns = 0;                   ///< blocks side by side
  int rows = 0;                      ///< blocks one below the other
  std::vector<double> centre;        ///< [block] DN
  std::vector<std::int64_t> pixels;  ///< [block]
  std::vector<GroupStatistics> groups;
  std::vector<double> total_square;  ///< [block] sum over pixels of (sum over all frames of (y - centre))^2
  /// [block] over all frames, hits included. Of the lowest, samples are counted where no other block goes
  /// lower.
  std::vector<Extreme> lowest, highest;
  CodeBits bits;                          ///< over all frames, hits included
  std::vector<NeighbourSums> neighbours;  ///< [block]; no pixels where the series has one frame
  std::vector<std::int64_t> block_hits;   ///< [block] samples set aside
  std::vector<std::int64_t> frame_hits;   ///< [frame] samples set aside
  std::vector<double> row_sums;           ///< [frame][row of the region] sum over columns of y, DN
  std::vector<double> column_sums;        ///< [column of the region] sum over rows and frames of y, DN

  std::size_t blocks() const { return centre.size(); }
};

struct SeriesStatistics {
  int frames = 0;
  FrameShape shape;
  std::vector<RegionStatistics> regions;
  /// [frame] XXH3-128 of the decoded pixels of every row that a region touches, as 32 hexadecimal digits; it
  /// depends neither on the container nor on how the regions lie within those rows.
  std::vector<std::string> fingerprints;
  std::vector<double>
      code_sample;  ///< ascending, each once: codes that occur in some rows of the first frame
};

}  // namespace evenfield
