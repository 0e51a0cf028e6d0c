#pragma once
/// How a frame is cut for accumulation. Part of the definition of the results: it depends on the frame and
/// its regions alone, never on threads or caches.
///
/// A region has 16 x 16 blocks, or fewer where a block would have under 64 pixels, nearly equal in size. A
/// block is cut into cells, nearly equal, at most 128 columns wide and 16 rows high, and of at most 1024
/// pixels (eight frames of 16 bits then fit the nearest cache), so that blocks are always whole unions of
/// cells. A band is a row of cells: all cells that lie in the same rows, of every region that is cut alike
/// there.

#include <cstddef>
#include <cstdint>
#include <vector>

#include "base/image.h"

namespace evenfield {

inline constexpr int kBlocksPerSide = 16;
inline constexpr int kBlockPixels = 64;
inline constexpr int kCellColumns = 128;
inline constexpr int kCellRows = 16;
inline constexpr std::size_t kCellPixels = 1024;

struct Cell {
  int region = 0;
  int block = 0;
  int x = 0;  ///< column of the frame
  int width = 0;
};

struct Band {
  int y = 0;  ///< row of the frame
  int height = 0;
  std::vector<Cell> cells;   ///< by region, from left to right
  std::vector<int> regions;  ///< the regions that have cells here
  std::vector<bool>
      hashed;  ///< [row of the band] this band gives the row to the fingerprint; no row is given twice
};

struct BlockGrid {
  Rect rect;
  int columns = 0;
  int rows = 0;
  int column_begin(int i) const { return rect.x + static_cast<int>(std::int64_t{rect.width} * i / columns); }
  int row_begin(int i) const { return rect.y + static_cast<int>(std::int64_t{rect.height} * i / rows); }
};

BlockGrid block_grid(const Rect& rect);

/// Most rows of a cell: as its widest cell has them.
int cell_rows(const BlockGrid& grid);

struct Geometry {
  std::vector<BlockGrid> grids;  ///< [region]
  std::vector<Band> bands;
};

/// Regions may overlap; each must lie inside the frame and have at least one pixel.
Geometry make_geometry(const FrameShape& shape, const std::vector<Rect>& regions);

/// Sizes of the balanced groups of at most eight: 9 frames are 5 + 4, not 8 + 1.
std::vector<int> balanced_groups(int frames);

}  // namespace evenfield
