#include "formats/tiff_page.h"

#include <tiffio.h>

#include <algorithm>
#include <bit>
#include <charconv>

#include "formats/acquisition_time.h"
#include "formats/frame_limits.h"

namespace evenfield {

namespace {

constexpr std::uint64_t kMaxTileBytes = std::uint64_t{1} << 30U;

template <class Number>
Number field(TIFF* tiff, std::uint32_t tag, Number absent) {
  Number value = absent;
  return TIFFGetFieldDefaulted(tiff, tag, &value) != 0 ? value : absent;
}

/// Reads one directory; every check is a member that answers with an error naming its tag.
class DirectoryReader {
 public:
  DirectoryReader(const TiffHandle& handle, Where where, std::uint64_t file_bytes)
      : handle_(handle), tiff_(handle.get()), where_(std::move(where)), file_bytes_(file_bytes) {}

  Result<TiffPage> read() {
    for (const auto check : {&DirectoryReader::read_shape, &DirectoryReader::read_colour,
                             &DirectoryReader::read_compression, &DirectoryReader::read_blocks}) {
      Status status = (this->*check)();
      if (!status) return status.error();
    }
    const char* time = nullptr;
    if (TIFFGetField(tiff_, TIFFTAG_DATETIME, &time) != 0 && time != nullptr)
      page_.acquired = time_from_tiff(time);
    read_planes();
    return page_;
  }

 private:
  Error wrong(const char* tag, const std::string& found, const std::string& expected) const {
    Where where = where_;
    where.key = tag;
    return Error{Errc::input, where, "found " + found + ", expected " + expected};
  }

  Status read_shape() {
    std::uint32_t width = 0;
    std::uint32_t height = 0;
    if (TIFFGetField(tiff_, TIFFTAG_IMAGEWIDTH, &width) == 0) return wrong("ImageWidth", "none", "a number");
    if (TIFFGetField(tiff_, TIFFTAG_IMAGELENGTH, &height) == 0)
      return wrong("ImageLength", "none", "a number");
    Where size = where_;
    size.key = "ImageWidth and ImageLength";
    Status fits = check_frame_size(width, height, size);
    if (!fits) return fits;
    const auto samples = field<std::uint16_t>(tiff_, TIFFTAG_SAMPLESPERPIXEL, 1);
    if (samples != 1) return wrong("SamplesPerPixel", std::to_string(samples), "1");
    if (const auto depth = field<std::uint32_t>(tiff_, TIFFTAG_IMAGEDEPTH, 1); depth != 1) {
      return wrong("ImageDepth", std::to_string(depth), "1");
    }
    const auto bits = field<std::uint16_t>(tiff_, TIFFTAG_BITSPERSAMPLE, 1);
    const auto format = field<std::uint16_t>(tiff_, TIFFTAG_SAMPLEFORMAT, SAMPLEFORMAT_UINT);
    FrameShape& shape = page_.frame.shape;
    shape.width = static_cast<int>(width);
    shape.height = static_cast<int>(height);
    // TIFF 6.0, section 19: a reader treats "undefined" as if the tag were absent, that is as unsigned.
    const bool is_unsigned = format == SAMPLEFORMAT_UINT || format == SAMPLEFORMAT_VOID;
    if (!is_unsigned && format != SAMPLEFORMAT_INT && format != SAMPLEFORMAT_IEEEFP) {
      return wrong("SampleFormat", std::to_string(format), "1 (unsigned), 2 (signed) or 3 (float)");
    }
    if (format == SAMPLEFORMAT_IEEEFP) {
      if (bits != 32 && bits != 64)
        return wrong("BitsPerSample", std::to_string(bits) + " of a float", "32 or 64");
      shape.type = bits == 32 ? PixelType::f32 : PixelType::f64;
      return Done{};
    }
    switch (bits) {
      case 8:
        shape.type = is_unsigned ? PixelType::u8 : PixelType::i8;
        return Done{};
      case 16:
        shape.type = is_unsigned ? PixelType::u16 : PixelType::i16;
        return Done{};
      case 32:
        shape.type = is_unsigned ? PixelType::u32 : PixelType::i32;
        return Done{};
      default:
        return wrong("BitsPerSample", std::to_string(bits), "8, 16 or 32");
    }
  }

  Status read_colour() {
    // A file without the tag has one sample a pixel and no colour table: it can only mean grey.
    std::uint16_t photometric = PHOTOMETRIC_MINISBLACK;
    TIFFGetField(tiff_, TIFFTAG_PHOTOMETRIC, &photometric);
    if (photometric == PHOTOMETRIC_MINISWHITE) {
      return wrong("PhotometricInterpretation", "0 (white is zero)", "1 (black is zero)");
    }
    if (photometric != PHOTOMETRIC_MINISBLACK) {
      return wrong("PhotometricInterpretation", std::to_string(photometric), "1 (black is zero)");
    }
    if (const auto order = field<std::uint16_t>(tiff_, TIFFTAG_FILLORDER, 1); order != FILLORDER_MSB2LSB) {
      return wrong("FillOrder", std::to_string(order), "1");
    }
    return Done{};
  }

  Status read_compression() {
    const auto compression = field<std::uint16_t>(tiff_, TIFFTAG_COMPRESSION, COMPRESSION_NONE);
    switch (compression) {
      case COMPRESSION_NONE:
        raw_ = true;
        return Done{};
      case COMPRESSION_PACKBITS:
        ratio_ = 64;
        return Done{};  // 128 equal bytes take 2
      case COMPRESSION_LZW:
        ratio_ = 4096;
        break;  // a code of 12 bits names at most 3839 bytes
      case COMPRESSION_ADOBE_DEFLATE:
      case COMPRESSION_DEFLATE:
        ratio_ = kMaxDeflateRatio;
        break;
      default:
        return wrong("Compression", std::to_string(compression),
                     "1 (none), 5 (LZW), 8 or 32946 (deflate) or 32773 (PackBits)");
    }
    const auto predictor = field<std::uint16_t>(tiff_, TIFFTAG_PREDICTOR, PREDICTOR_NONE);
    if (predictor == PREDICTOR_FLOATINGPOINT && is_floating(page_.frame.shape.type)) return Done{};
    if (predictor != PREDICTOR_NONE && predictor != PREDICTOR_HORIZONTAL) {
      return wrong("Predictor", std::to_string(predictor), "1 or 2, or 3 for floats");
    }
    return Done{};
  }

  Status read_blocks() {
    page_.tiled = TIFFIsTiled(tiff_) != 0;
    Status status = page_.tiled ? read_tile_size() : read_strip_size();
    if (!status) return status;
    const FrameShape& shape = page_.frame.shape;
    const std::size_t pixel_bytes = bytes_per_pixel(shape.type);
    const auto block_row_bytes = static_cast<std::uint64_t>(page_.block_width) * pixel_bytes;
    const int across = (shape.width - 1) / page_.block_width + 1;
    const int down = (shape.height - 1) / page_.block_height + 1;
    std::uint64_t stored = 0;
    for (int row = 0; row < down; ++row) {
      const int first = row * page_.block_height;
      const int rows = page_.tiled ? page_.block_height : std::min(page_.block_height, shape.height - first);
      for (int column = 0; column < across; ++column) {
        Status block = read_block(static_cast<std::uint32_t>(row * across + column), first, rows,
                                  static_cast<std::uint64_t>(rows) * block_row_bytes, stored);
        if (!block) return block;
      }
    }
    if (!raw_ && stored * ratio_ < static_cast<std::uint64_t>(shape.width) * pixel_bytes *
                                       static_cast<std::uint64_t>(shape.height)) {
      return wrong(
          counts_tag(), std::to_string(stored) + " bytes in all",
          "enough for " + std::to_string(shape.width) + " x " + std::to_string(shape.height) + " pixels");
    }
    // libtiff repairs counts that it finds absent or contradictory, and says so only in a warning.
    if (handle_.warnings().find("ByteCounts") != std::string::npos) {
      return wrong(counts_tag(), "none or contradictory ones (" + handle_.warnings() + ")",
                   "the size of every strip or tile");
    }
    const std::uint64_t apart = static_cast<std::uint64_t>(page_.block_height) *
                                static_cast<std::uint64_t>(shape.width) * pixel_bytes;
    if ((!raw_ || page_.tiled) && page_.block_height < shape.height && apart <= kMostBytesApart)
      page_.frame.rows_apart = page_.block_height;
    page_.frame.encoding.swap_bytes = TIFFIsByteSwapped(tiff_) != 0 && pixel_bytes > 1;
    return Done{};
  }

  Status read_strip_size() {
    const auto rows = field<std::uint32_t>(tiff_, TIFFTAG_ROWSPERSTRIP, 0xFFFFFFFFU);
    if (rows == 0) return wrong("RowsPerStrip", "0", "at least 1");
    page_.block_width = page_.frame.shape.width;
    page_.block_height =
        static_cast<int>(std::min(rows, static_cast<std::uint32_t>(page_.frame.shape.height)));
    return Done{};
  }

  Status read_tile_size() {
    const auto width = field<std::uint32_t>(tiff_, TIFFTAG_TILEWIDTH, 0);
    const auto height = field<std::uint32_t>(tiff_, TIFFTAG_TILELENGTH, 0);
    if (width < 1 || height < 1 || width > kMaxFrameSide || height > kMaxFrameSide ||
        std::uint64_t{width} * height * bytes_per_pixel(page_.frame.shape.type) > kMaxTileBytes) {
      return wrong("TileWidth and TileLength", std::to_string(width) + " x " + std::to_string(height),
                   "1 to " + std::to_string(kMaxFrameSide) + " a side and at most " +
                       std::to_string(kMaxTileBytes) + " bytes");
    }
    page_.block_width = static_cast<int>(width);
    page_.block_height = static_cast<int>(height);
    return Done{};
  }

  /// One strip or tile, of `bytes` bytes when decoded, whose first row is `first`.
  Status read_block(std::uint32_t number, int first, int rows, std::uint64_t bytes, std::uint64_t& stored) {
    int failed = 0;
    const std::uint64_t offset = TIFFGetStrileOffsetWithErr(tiff_, number, &failed);
    if (failed != 0) return wrong(offsets_tag(), handle_.errors(), "the place of " + name(number));
    const std::uint64_t count = TIFFGetStrileByteCountWithErr(tiff_, number, &failed);
    if (failed != 0) return wrong(counts_tag(), handle_.errors(), "the size of " + name(number));
    if (offset == 0) return wrong(offsets_tag(), "no place of " + name(number), "one");
    const std::uint64_t needed = raw_ ? bytes : count;
    if (offset > file_bytes_ || needed > file_bytes_ - offset) {
      // The sum may overflow; then the file is damaged rather than cut off, and the offset says it best.
      const std::uint64_t end = offset + needed;
      const std::string expected =
          end < offset ? "an offset inside the file" : "at least " + std::to_string(end);
      return wrong(offsets_tag(), std::to_string(file_bytes_) + " bytes in the file",
                   expected + " for " + name(number));
    }
    if (raw_ && count != bytes) {
      return wrong(counts_tag(), std::to_string(count) + " bytes for " + name(number), std::to_string(bytes));
    }
    if (count == 0) return wrong(counts_tag(), "0 bytes for " + name(number), "at least 1");
    stored += count;
    if (!raw_ || page_.tiled) return Done{};
    std::vector<RawExtent>& extents = page_.frame.extents;
    const std::uint64_t row_bytes = bytes / static_cast<std::uint64_t>(rows);
    if (!extents.empty() &&
        extents.back().offset + static_cast<std::uint64_t>(extents.back().rows) * row_bytes == offset) {
      extents.back().rows += rows;
    } else {
      extents.push_back({first, rows, offset});
    }
    return Done{};
  }

  /// ImageJ writes stacks beyond 4 GB as one page, whose description tells how many frames follow it.
  void read_planes() {
    const char* text = nullptr;
    if (page_.frame.extents.size() != 1 || TIFFLastDirectory(tiff_) == 0) return;
    if (TIFFGetField(tiff_, TIFFTAG_IMAGEDESCRIPTION, &text) == 0 || text == nullptr) return;
    const std::string_view description(text);
    const std::size_t at = description.find("\nimages=");
    if (!description.starts_with("ImageJ=") || at == std::string_view::npos) return;
    int planes = 1;
    std::from_chars(description.data() + at + 8, description.data() + description.size(), planes);
    page_.planes = std::max(planes, 1);
  }

  const char* offsets_tag() const { return page_.tiled ? "TileOffsets" : "StripOffsets"; }
  const char* counts_tag() const { return page_.tiled ? "TileByteCounts" : "StripByteCounts"; }
  std::string name(std::uint32_t number) const {
    return (page_.tiled ? "tile " : "strip ") + std::to_string(std::uint64_t{number} + 1);
  }

  const TiffHandle& handle_;
  TIFF* tiff_;
  Where where_;
  std::uint64_t file_bytes_;
  TiffPage page_;
  bool raw_ = false;
  std::uint64_t ratio_ = 1;  ///< most decoded bytes that one stored byte can stand for
};

}  // namespace

bool is_frame(const TiffHandle& handle) {
  const auto kind = field<std::uint32_t>(handle.get(), TIFFTAG_SUBFILETYPE, 0);
  return (kind & std::uint32_t{FILETYPE_REDUCEDIMAGE | FILETYPE_MASK}) == 0;
}

Result<TiffPage> read_tiff_page(const TiffHandle& handle,
                                const std::filesystem::path& path,
                                std::uint64_t file_bytes,
                                int page) {
  return DirectoryReader(handle, Where{path, {}, page, {}}, file_bytes).read();
}

}  // namespace evenfield
