#include "accumulate/geometry.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <vector>

#include "accumulate/series_statistics.h"

using namespace evenfield;

namespace {

const FrameShape kShapes[] = {{2048, 2048, PixelType::u16}, {160, 128, PixelType::u16},
                              {2560, 2160, PixelType::u16}, {8, 8, PixelType::u8},
                              {1, 5000, PixelType::u8},     {5000, 1, PixelType::u8},
                              {97, 61, PixelType::u16},     {14204, 10652, PixelType::u16}};

}  // namespace

TEST_CASE("every pixel of a region lies in exactly one cell, and in the block that the cell names") {
  for (const FrameShape& shape : kShapes) {
    const Rect rect{0, 0, shape.width, shape.height};
    const Geometry geometry = make_geometry(shape, {rect});
    const BlockGrid& grid = geometry.grids.front();
    std::int64_t pixels = 0;
    int end = 0;
    for (const Band& band : geometry.bands) {
      REQUIRE(band.y == end);
      REQUIRE(band.height >= 1);
      REQUIRE(band.height <= kCellRows);
      end = band.y + band.height;
      int right = 0;
      for (const Cell& cell : band.cells) {
        REQUIRE(cell.x == right);
        REQUIRE(cell.width >= 1);
        REQUIRE(cell.width <= kCellColumns);
        REQUIRE(static_cast<std::size_t>(cell.width * band.height) <= kCellPixels);
        right = cell.x + cell.width;
        pixels += std::int64_t{cell.width} * band.height;
        const int column = cell.block % grid.columns;
        const int row = cell.block / grid.columns;
        REQUIRE(cell.x >= grid.column_begin(column));
        REQUIRE(right <= grid.column_begin(column + 1));
        REQUIRE(band.y >= grid.row_begin(row));
        REQUIRE(end <= grid.row_begin(row + 1));
      }
      REQUIRE(right == shape.width);
    }
    CHECK(end == shape.height);
    CHECK(pixels == std::int64_t{shape.width} * shape.height);
  }
}

TEST_CASE("a region has 16 x 16 blocks, or fewer of 64 pixels or more") {
  for (const FrameShape& shape : kShapes) {
    const BlockGrid grid = block_grid({0, 0, shape.width, shape.height});
    if (shape.width >= 128 && shape.height >= 128) {
      CHECK(grid.columns == 16);
      CHECK(grid.rows == 16);
    }
    for (int i = 0; i < grid.columns; ++i)
      for (int j = 0; j < grid.rows; ++j) {
        const int pixels =
            (grid.column_begin(i + 1) - grid.column_begin(i)) * (grid.row_begin(j + 1) - grid.row_begin(j));
        REQUIRE((pixels >= kBlockPixels || (grid.columns == 1 && grid.rows == 1)));
      }
  }
  CHECK(block_grid({0, 0, 160, 128}).columns == 16);  // 10 x 8 pixels a block
}

TEST_CASE("amplifiers side by side share bands, and no row is hashed twice") {
  const FrameShape shape{2048, 512, PixelType::u16};
  const Geometry pair = make_geometry(shape, {{0, 0, 1024, 512}, {1024, 0, 1024, 512}});
  CHECK(pair.bands.size() == 512 / kCellRows);
  CHECK(pair.bands.front().regions == std::vector<int>{0, 1});
  const Geometry overlapping = make_geometry(shape, {{0, 0, 2048, 512}, {0, 100, 2048, 200}});
  for (const Geometry& geometry : {pair, overlapping}) {
    std::vector<int> count(512, 0);
    for (const Band& band : geometry.bands)
      for (int y = 0; y < band.height; ++y)
        count[static_cast<std::size_t>(band.y + y)] += band.hashed[static_cast<std::size_t>(y)] ? 1 : 0;
    CHECK(std::all_of(count.begin(), count.end(), [](int n) { return n == 1; }));
  }
}

TEST_CASE("groups are balanced: nine frames are 5 + 4, not 8 + 1") {
  CHECK(balanced_groups(1) == std::vector<int>{1});
  CHECK(balanced_groups(8) == std::vector<int>{8});
  CHECK(balanced_groups(9) == std::vector<int>{5, 4});
  CHECK(balanced_groups(17) == std::vector<int>{6, 6, 5});
  CHECK(balanced_groups(1000).size() == 125);
}
