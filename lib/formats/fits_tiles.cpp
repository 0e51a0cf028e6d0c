#include "formats/fits_tiles.h"

#include <zlib.h>

#include <algorithm>
#include <string>
#include <vector>

namespace evenfield {

namespace {

constexpr std::size_t kChunk = std::size_t{1} << 16U;

Error wrong(const std::string& what) { return Error{Errc::input, {}, what}; }

/// True if `packed` is one gzip stream of at most `most` bytes.
bool unpacks(std::vector<unsigned char>& packed, std::uint64_t most, std::vector<unsigned char>& chunk) {
  z_stream state{};
  if (inflateInit2(&state, 15 + 16) != Z_OK) return false;
  state.next_in = packed.data();
  state.avail_in = static_cast<uInt>(packed.size());
  int result = Z_OK;
  while (result == Z_OK && state.total_out <= most) {
    state.next_out = chunk.data();
    state.avail_out = static_cast<uInt>(chunk.size());
    result = inflate(&state, Z_NO_FLUSH);
  }
  const bool whole = result == Z_STREAM_END && state.total_out <= most;
  inflateEnd(&state);
  return whole;
}

}  // namespace

Status check_gzip_tiles(fitsfile* handle, const FitsImage& image, std::uint64_t plane) {
  // Tiles are table rows, along the first axis first, so that those of a plane are neighbours.
  std::uint64_t tile_pixels = 1;
  LONGLONG tiles = 1;  // of one plane
  LONGLONG stride = 0;
  LONGLONG layer = 0;
  for (std::size_t axis = 0; axis < image.axes.size(); ++axis) {
    const long length = image.axes[axis];
    const long tile = image.tile[axis];
    const LONGLONG count = (length - 1) / tile + 1;
    tile_pixels *= static_cast<std::uint64_t>(tile);
    if (axis < 2) {
      tiles *= count;
      stride = 1;
      continue;
    }
    layer += stride * (static_cast<LONGLONG>(plane % static_cast<std::uint64_t>(length)) / tile);
    plane /= static_cast<std::uint64_t>(length);
    stride *= count;
  }
  std::vector<unsigned char> packed;
  std::vector<unsigned char> chunk(kChunk);
  // Of a float image, tiles that cannot be rounded are packed with gzip in a column of their own, whatever
  // the rest is.
  for (const char* name : {"COMPRESSED_DATA", "GZIP_COMPRESSED_DATA"}) {
    if (name[0] == 'C' && !image.gzip) continue;
    std::string column_name = name;
    int column = 0;
    int status = 0;
    fits_get_colnum(handle, CASEINSEN, column_name.data(), &column, &status);
    if (status == COL_NOT_FOUND) {
      fits_clear_errmsg();
      continue;
    }
    int type = 0;
    fits_get_coltype(handle, column, &type, nullptr, nullptr, &status);
    if (status == 0 && type != -TBYTE) return wrong("found no column of bytes, expected one: " + column_name);
    for (LONGLONG row = layer * tiles + 1; row <= (layer + 1) * tiles; ++row) {
      LONGLONG bytes = 0;
      LONGLONG place = 0;
      fits_read_descriptll(handle, column, row, &bytes, &place, &status);
      if (status != 0) break;
      if (bytes == 0) continue;
      if (bytes < 0 || static_cast<std::uint64_t>(bytes) > image.data_bytes) {
        return wrong("tile " + std::to_string(row) + ": found a size of " + std::to_string(bytes) +
                     " bytes, expected at most " + std::to_string(image.data_bytes));
      }
      packed.resize(static_cast<std::size_t>(bytes));
      fits_read_col(handle, TBYTE, column, row, 1, bytes, nullptr, packed.data(), nullptr, &status);
      if (status != 0) break;
      if (!unpacks(packed, tile_pixels * 8, chunk)) {
        return wrong("tile " + std::to_string(row) + ": found damaged gzip data, expected " +
                     std::to_string(tile_pixels) + " pixels");
      }
    }
    if (status != 0) return wrong("cannot be decoded: " + fits_words(status));
  }
  return Done{};
}

}  // namespace evenfield
