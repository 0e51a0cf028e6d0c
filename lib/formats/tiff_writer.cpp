#include "formats/tiff_writer.h"

#include <tiffio.h>

#include <algorithm>
#include <cstring>
#include <string>
#include <vector>

#include "formats/tiff_handle.h"

namespace evenfield {

namespace {

constexpr int kCompressedStripRows = 64;
constexpr std::uint64_t kWriterMemory = std::uint64_t{1} << 34U;

std::uint16_t sample_format(PixelType type) {
  if (is_floating(type)) return SAMPLEFORMAT_IEEEFP;
  const bool is_signed = type == PixelType::i8 || type == PixelType::i16 || type == PixelType::i32;
  return is_signed ? SAMPLEFORMAT_INT : SAMPLEFORMAT_UINT;
}

std::uint16_t tiff_compression(WriteCompression compression) {
  switch (compression) {
    case WriteCompression::deflate:
      return COMPRESSION_ADOBE_DEFLATE;
    case WriteCompression::lzw:
      return COMPRESSION_LZW;
    case WriteCompression::packbits:
      return COMPRESSION_PACKBITS;
    default:
      return COMPRESSION_NONE;
  }
}

class TiffWriter : public FrameWriter {
 public:
  TiffWriter(
      std::filesystem::path path, FrameShape shape, int frames, WriteOptions options, TiffHandle handle)
      : path_(std::move(path)),
        shape_(shape),
        frames_(frames),
        options_(std::move(options)),
        handle_(std::move(handle)) {}

  Status add(const void* pixels) override {
    if (written_ >= frames_) return error("found one more frame, expected " + std::to_string(frames_));
    TIFF* tiff = handle_.get();
    if (tiff == nullptr) return error("is closed already");
    if (!set_tags()) return failed();
    const bool done = options_.tile_size > 0 ? write_tiles(pixels) : write_strips(pixels);
    if (!done || TIFFWriteDirectory(tiff) == 0 || !handle_.errors().empty()) return failed();
    ++written_;
    return Done{};
  }

  Status finish() override {
    if (written_ != frames_) {
      return error("found " + std::to_string(written_) + " frames, expected " + std::to_string(frames_));
    }
    handle_.close();
    if (!handle_.errors().empty()) return failed();
    return Done{};
  }

 private:
  Error error(const std::string& what) const {
    return Error{Errc::output, {path_, {}, written_ + 1, {}}, what};
  }
  Error failed() const { return error("cannot be written: " + handle_.errors()); }

  bool set_tags() {
    TIFF* tiff = handle_.get();
    const std::uint16_t compression = tiff_compression(options_.compression);
    const int bits = static_cast<int>(8 * bytes_per_pixel(shape_.type));
    // Arguments of 16 bits travel as int.
    bool good = TIFFSetField(tiff, TIFFTAG_IMAGEWIDTH, static_cast<std::uint32_t>(shape_.width)) != 0 &&
                TIFFSetField(tiff, TIFFTAG_IMAGELENGTH, static_cast<std::uint32_t>(shape_.height)) != 0 &&
                TIFFSetField(tiff, TIFFTAG_BITSPERSAMPLE, bits) != 0 &&
                TIFFSetField(tiff, TIFFTAG_SAMPLESPERPIXEL, 1) != 0 &&
                TIFFSetField(tiff, TIFFTAG_SAMPLEFORMAT, int{sample_format(shape_.type)}) != 0 &&
                TIFFSetField(tiff, TIFFTAG_PHOTOMETRIC, PHOTOMETRIC_MINISBLACK) != 0 &&
                TIFFSetField(tiff, TIFFTAG_PLANARCONFIG, PLANARCONFIG_CONTIG) != 0 &&
                TIFFSetField(tiff, TIFFTAG_COMPRESSION, int{compression}) != 0;
    const bool has_predictor = compression == COMPRESSION_LZW || compression == COMPRESSION_ADOBE_DEFLATE;
    if (has_predictor && !is_floating(shape_.type)) {
      good = good && TIFFSetField(tiff, TIFFTAG_PREDICTOR, PREDICTOR_HORIZONTAL) != 0;
    }
    if (options_.tile_size > 0) {
      const auto side = static_cast<std::uint32_t>(options_.tile_size);
      return good && TIFFSetField(tiff, TIFFTAG_TILEWIDTH, side) != 0 &&
             TIFFSetField(tiff, TIFFTAG_TILELENGTH, side) != 0;
    }
    return good && TIFFSetField(tiff, TIFFTAG_ROWSPERSTRIP, static_cast<std::uint32_t>(strip_rows())) != 0;
  }

  int strip_rows() const {
    int rows = options_.rows_per_strip;
    if (rows == 0)
      rows = options_.compression == WriteCompression::none ? shape_.height : kCompressedStripRows;
    return std::min(rows, shape_.height);
  }

  bool write_strips(const void* pixels) {
    const std::size_t row_bytes = static_cast<std::size_t>(shape_.width) * bytes_per_pixel(shape_.type);
    std::uint32_t strip = 0;
    for (int y = 0; y < shape_.height; y += strip_rows(), ++strip) {
      const auto rows = static_cast<std::size_t>(std::min(strip_rows(), shape_.height - y));
      // A copy, because libtiff swaps bytes and takes differences in the caller's buffer.
      const char* from = static_cast<const char*>(pixels) + static_cast<std::size_t>(y) * row_bytes;
      block_.assign(from, from + rows * row_bytes);
      const auto bytes = static_cast<tmsize_t>(block_.size());
      if (TIFFWriteEncodedStrip(handle_.get(), strip, block_.data(), bytes) != bytes) return false;
    }
    return true;
  }

  bool write_tiles(const void* pixels) {
    const std::size_t pixel_bytes = bytes_per_pixel(shape_.type);
    const std::size_t row_bytes = static_cast<std::size_t>(shape_.width) * pixel_bytes;
    const auto side = static_cast<std::size_t>(options_.tile_size);
    std::uint32_t tile = 0;
    for (int y = 0; y < shape_.height; y += options_.tile_size) {
      for (int x = 0; x < shape_.width; x += options_.tile_size, ++tile) {
        block_.assign(side * side * pixel_bytes, 0);
        const int rows = std::min(options_.tile_size, shape_.height - y);
        const auto columns = static_cast<std::size_t>(std::min(options_.tile_size, shape_.width - x));
        for (int row = 0; row < rows; ++row) {
          std::memcpy(block_.data() + static_cast<std::size_t>(row) * side * pixel_bytes,
                      static_cast<const char*>(pixels) + static_cast<std::size_t>(y + row) * row_bytes +
                          static_cast<std::size_t>(x) * pixel_bytes,
                      columns * pixel_bytes);
        }
        const auto bytes = static_cast<tmsize_t>(block_.size());
        if (TIFFWriteEncodedTile(handle_.get(), tile, block_.data(), bytes) != bytes) return false;
      }
    }
    return true;
  }

  std::filesystem::path path_;
  FrameShape shape_;
  int frames_;
  WriteOptions options_;
  TiffHandle handle_;
  int written_ = 0;
  std::vector<char> block_;
};

}  // namespace

Result<std::unique_ptr<FrameWriter>> create_tiff(const std::filesystem::path& path,
                                                 const FrameShape& shape,
                                                 int frames,
                                                 const WriteOptions& options) {
  const Where where{path, {}, {}, {}};
  if (options.compression == WriteCompression::rice || options.compression == WriteCompression::gzip) {
    return Error{Errc::output, where, "found a compression of FITS, expected one of TIFF"};
  }
  // TIFF 6.0, section 15.
  if (options.tile_size < 0 || options.tile_size % 16 != 0) {
    return Error{Errc::output, where,
                 "found tiles of " + std::to_string(options.tile_size) + ", expected a multiple of 16"};
  }
  if (options.rows_per_strip < 0)
    return Error{Errc::output, where, "found a negative number of rows per strip"};
  const std::string mode =
      std::string("w") + (options.big_endian ? "b" : "l") + (options.big_tiff ? "8" : "");
  auto handle = TiffHandle::open(path, mode.c_str(), kWriterMemory, Errc::output);
  if (!handle) return handle.error();
  return std::unique_ptr<FrameWriter>(
      std::make_unique<TiffWriter>(path, shape, frames, options, std::move(*handle)));
}

}  // namespace evenfield
