#include "accumulate/geometry.h"

#include <algorithm>
#include <map>
#include <tuple>

#include "accumulate/series_statistics.h"

namespace evenfield {
namespace {

/// `length` cut into the fewest nearly equal parts of at most `longest`; begins of the parts, and the end.
std::vector<int> cuts(int begin, int end, int longest) {
  const int parts = (end - begin + longest - 1) / longest;
  std::vector<int> out;
  for (int i = 0; i <= parts; ++i)
    out.push_back(begin + static_cast<int>(std::int64_t{end - begin} * i / parts));
  return out;
}

}  // namespace

BlockGrid block_grid(const Rect& rect) {
  BlockGrid grid{rect, std::min(kBlocksPerSide, rect.width), std::min(kBlocksPerSide, rect.height)};
  const auto smallest = [&] { return (rect.width / grid.columns) * (rect.height / grid.rows); };
  while (smallest() < kBlockPixels && grid.columns * grid.rows > 1) {
    // The narrower side grows first, so that blocks tend to squares.
    const bool widen =
        grid.rows == 1 || (grid.columns > 1 && rect.width / grid.columns <= rect.height / grid.rows);
    --(widen ? grid.columns : grid.rows);
  }
  return grid;
}

int cell_rows(const BlockGrid& grid) {
  const int block = (grid.rect.width + grid.columns - 1) / grid.columns;
  const int cells = (block + kCellColumns - 1) / kCellColumns;
  const int cell = (block + cells - 1) / cells;
  return cell * kCellRows <= static_cast<int>(kCellPixels) ? kCellRows : kCellRows / 2;
}

Geometry make_geometry(const FrameShape& shape, const std::vector<Rect>& regions) {
  Geometry geometry;
  // Regions with the same rows, cut alike, share bands, so that their pixels are read once.
  std::map<std::tuple<int, int, int, int>, std::vector<int>> alike;
  for (std::size_t i = 0; i < regions.size(); ++i) {
    const BlockGrid grid = block_grid(regions[i]);
    alike[{regions[i].y, regions[i].height, grid.rows, cell_rows(grid)}].push_back(static_cast<int>(i));
    geometry.grids.push_back(grid);
  }
  std::vector<bool> given(static_cast<std::size_t>(shape.height), false);
  for (const auto& [rows, members] : alike) {
    const BlockGrid& first = geometry.grids[static_cast<std::size_t>(members.front())];
    for (int block_row = 0; block_row < first.rows; ++block_row) {
      const std::vector<int> y =
          cuts(first.row_begin(block_row), first.row_begin(block_row + 1), cell_rows(first));
      for (std::size_t k = 0; k + 1 < y.size(); ++k) {
        Band band{y[k], y[k + 1] - y[k], {}, members, {}};
        for (const int region : members) {
          const BlockGrid& grid = geometry.grids[static_cast<std::size_t>(region)];
          for (int column = 0; column < grid.columns; ++column) {
            const std::vector<int> x =
                cuts(grid.column_begin(column), grid.column_begin(column + 1), kCellColumns);
            for (std::size_t m = 0; m + 1 < x.size(); ++m)
              band.cells.push_back({region, block_row * grid.columns + column, x[m], x[m + 1] - x[m]});
          }
        }
        for (int row = band.y; row < band.y + band.height; ++row) {
          band.hashed.push_back(!given[static_cast<std::size_t>(row)]);
          given[static_cast<std::size_t>(row)] = true;
        }
        geometry.bands.push_back(std::move(band));
      }
    }
  }
  return geometry;
}

std::vector<int> balanced_groups(int frames) {
  const int groups = (frames + kGroupFrames - 1) / kGroupFrames;
  std::vector<int> sizes;
  for (int i = 0; i < groups; ++i) sizes.push_back(frames / groups + (i < frames % groups ? 1 : 0));
  return sizes;
}

}  // namespace evenfield
