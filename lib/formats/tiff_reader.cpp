#include "formats/tiff_reader.h"

#include <tiffio.h>

#include <algorithm>
#include <array>
#include <cstring>
#include <vector>

#include "base/interrupt.h"
#include "formats/disk_file.h"
#include "formats/frame_limits.h"
#include "formats/raw_pixels.h"
#include "formats/tiff_handle.h"
#include "formats/tiff_page.h"

namespace evenfield {

namespace {

/// Read; no memory mapping (a file that shrinks would kill the program); no pretended short strips.
constexpr const char* kReadMode = "rmc";
/// Bytes that decode in a few tenths of a second.
constexpr tmsize_t kLargeStrip = tmsize_t{64} << 20U;
constexpr std::uint64_t kDirectoryMemory = std::uint64_t{1} << 28U;

Error damaged(const std::filesystem::path& path,
              int page,
              const TiffHandle& handle,
              const std::string& what) {
  const std::string& said = handle.errors().empty() ? handle.warnings() : handle.errors();
  return Error{Errc::input, {path, {}, page, {}}, what + (said.empty() ? "" : ": " + said)};
}

/// libtiff takes a file that ends inside the last directory's link to the next page for one that ends after
/// that page; the pages behind it would be missed. TIFF 6.0, section 2: a count of entries, the entries, the
/// link.
Status check_last_link(const DiskFile& bytes, TIFF* tiff, int page) {
  std::array<unsigned char, 8> count{};
  Status read = bytes.read(0, count.data(), 4);
  if (!read) return read;
  const bool big_endian = count[0] == 'M';
  const bool big_tiff = count[big_endian ? 3 : 2] == 43;
  const std::uint64_t directory = TIFFCurrentDirOffset(tiff);
  const std::size_t width = big_tiff ? 8 : 2;
  read = bytes.read(directory, count.data(), width);
  if (!read) return read;
  std::uint64_t entries = 0;
  for (std::size_t i = 0; i < width; ++i) entries = entries << 8U | count[big_endian ? i : width - 1 - i];
  const std::uint64_t end = directory + (big_tiff ? 8 + 20 * entries + 8 : 2 + 12 * entries + 4);
  if (end > bytes.size()) {
    return Error{
        Errc::input,
        {bytes.path(), {}, page, {}},
        "found " + std::to_string(bytes.size()) + " bytes, expected at least " + std::to_string(end)};
  }
  return Done{};
}

/// Frames that follow the one page of an ImageJ stack, without pages of their own.
Status add_planes(FrameFile& file, const TiffPage& page, std::uint64_t file_bytes) {
  const FrameShape& shape = page.frame.shape;
  const std::uint64_t frame_bytes = static_cast<std::uint64_t>(shape.width) *
                                    static_cast<std::uint64_t>(shape.height) * bytes_per_pixel(shape.type);
  const std::uint64_t first = page.frame.extents.front().offset;
  const auto planes = static_cast<std::uint64_t>(page.planes);
  if (planes > (file_bytes - first) / frame_bytes || planes > kMaxPages) {
    return Error{Errc::input,
                 {file.path, {}, 1, "ImageDescription"},
                 "found images=" + std::to_string(planes) + " and " + std::to_string(file_bytes) +
                     " bytes in the file, expected as many frames of " + std::to_string(frame_bytes) +
                     " bytes from byte " + std::to_string(first) + " on"};
  }
  for (std::uint64_t plane = 1; plane < planes; ++plane) {
    FramePage next = page.frame;
    next.extents.front().offset = first + plane * frame_bytes;
    file.pages.push_back(std::move(next));
  }
  return Done{};
}

class TiffDecoder : public FrameDecoder {
 public:
  TiffDecoder(const FrameFile& file, DiskFile bytes, TiffHandle handle)
      : file_(file), bytes_(std::move(bytes)), handle_(std::move(handle)) {}

  Status decode(int page, void* pixels) override {
    Status known = check_number(page);
    if (!known) return known;
    const FramePage& frame = file_.pages[static_cast<std::size_t>(page - 1)];
    if (frame.extents.empty()) return decode_rows(page, 0, frame.shape.height, pixels);
    Status status = read_raw_frame(bytes_, frame, pixels);
    if (status) return status;
    Error error = status.error();
    error.where.page = page;
    return error;
  }

  Status decode_rows(int page, int first_row, int rows, void* pixels) override {
    Status there = check_number(page);
    if (there) there = go_to(page);
    if (!there) return there;
    if (now_page_ != page) {
      // Read again: nothing of what is decoded may rest on a file that has changed since it was inspected.
      now_page_ = 0;
      auto now = read_tiff_page(handle_, file_.path, bytes_.size(), page);
      if (!now) return now.error();
      if (now->frame.shape != file_.pages[static_cast<std::size_t>(page - 1)].shape)
        return damaged(file_.path, page, handle_, "changed while it was read");
      now_ = std::move(*now);
      now_page_ = page;
    }
    const int end = std::min(first_row + rows, now_.frame.shape.height);
    return now_.tiled ? decode_tiles(page, first_row, end, pixels)
                      : decode_strips(page, first_row, end, pixels);
  }

 private:
  Status check_number(int page) const {
    if (page < 1 || page > static_cast<int>(file_.pages.size())) {
      return Error{Errc::input,
                   {file_.path, {}, page, {}},
                   "found " + std::to_string(file_.pages.size()) + " pages, expected this one among them"};
    }
    return Done{};
  }

  /// Makes frame `page` the current directory. Pages are looked for once, on from the farthest one seen.
  Status go_to(int page) {
    handle_.forget();
    TIFF* tiff = handle_.get();
    const auto wanted = static_cast<std::size_t>(page);
    while (directories_.size() < wanted) {
      now_page_ = 0;
      if (walked_ > 0) {
        if (TIFFCurrentDirOffset(tiff) != frontier_ && TIFFSetSubDirectory(tiff, frontier_) == 0)
          return lost(page);
        if (walked_ > kMaxPages || TIFFLastDirectory(tiff) != 0 || TIFFReadDirectory(tiff) == 0)
          return lost(page);
      }
      ++walked_;
      frontier_ = TIFFCurrentDirOffset(tiff);
      if (is_frame(handle_)) directories_.push_back(frontier_);
      if (directories_.size() < wanted) handle_.forget();
    }
    const std::uint64_t offset = directories_[wanted - 1];
    if (TIFFCurrentDirOffset(tiff) != offset) {
      now_page_ = 0;
      handle_.forget();
      if (TIFFSetSubDirectory(tiff, offset) == 0) return lost(page);
    }
    return Done{};
  }

  Error lost(int page) const { return damaged(file_.path, page, handle_, "its directory cannot be read"); }

  /// Rows [begin, end); begin is the first of a strip.
  Status decode_strips(int page, int begin, int end, void* pixels) {
    const FrameShape& shape = now_.frame.shape;
    const std::size_t row_bytes = static_cast<std::size_t>(shape.width) * bytes_per_pixel(shape.type);
    handle_.forget();
    auto strip = static_cast<std::uint32_t>(begin / now_.block_height);
    for (int y = begin; y < end; y += now_.block_height, ++strip) {
      const auto rows = static_cast<std::size_t>(std::min(now_.block_height, shape.height - y));
      const auto bytes = static_cast<tmsize_t>(rows * row_bytes);
      char* to = static_cast<char*>(pixels) + static_cast<std::size_t>(y - begin) * row_bytes;
      if (interrupt_requested()) return interrupted();
      if (bytes > kLargeStrip) {
        Status status = decode_by_rows(page, y, static_cast<int>(rows), to);
        if (!status) return status;
        continue;
      }
      if (TIFFReadEncodedStrip(handle_.get(), strip, to, bytes) != bytes || !handle_.errors().empty()) {
        return damaged(file_.path, page, handle_,
                       "strip " + std::to_string(strip + 1) + " cannot be decoded");
      }
    }
    return Done{};
  }

  /// A strip that takes long, row by row: slower, but a wish to stop is seen in the middle of it.
  Status decode_by_rows(int page, int first, int rows, char* to) {
    const auto row_bytes = static_cast<std::size_t>(TIFFScanlineSize64(handle_.get()));
    for (int row = 0; row < rows; ++row, to += row_bytes) {
      if (row % 64 == 0 && interrupt_requested()) return interrupted();
      if (TIFFReadScanline(handle_.get(), to, static_cast<std::uint32_t>(first + row), 0) != 1 ||
          !handle_.errors().empty()) {
        return damaged(file_.path, page, handle_,
                       "row " + std::to_string(first + row + 1) + " cannot be decoded");
      }
    }
    return Done{};
  }

  /// Rows [begin, end); begin is the first of a tile.
  Status decode_tiles(int page, int begin, int end, void* pixels) {
    const FrameShape& shape = now_.frame.shape;
    const std::size_t pixel_bytes = bytes_per_pixel(shape.type);
    const std::size_t row_bytes = static_cast<std::size_t>(shape.width) * pixel_bytes;
    const std::size_t tile_row_bytes = static_cast<std::size_t>(now_.block_width) * pixel_bytes;
    tile_.resize(tile_row_bytes * static_cast<std::size_t>(now_.block_height));
    const auto bytes = static_cast<tmsize_t>(tile_.size());
    handle_.forget();
    const int across = (shape.width - 1) / now_.block_width + 1;
    auto tile = static_cast<std::uint32_t>(begin / now_.block_height * across);
    for (int y = begin; y < end; y += now_.block_height) {
      for (int x = 0; x < shape.width; x += now_.block_width, ++tile) {
        if (interrupt_requested()) return interrupted();
        if (TIFFReadEncodedTile(handle_.get(), tile, tile_.data(), bytes) != bytes ||
            !handle_.errors().empty()) {
          return damaged(file_.path, page, handle_,
                         "tile " + std::to_string(tile + 1) + " cannot be decoded");
        }
        const int rows = std::min(now_.block_height, shape.height - y);
        const auto columns = static_cast<std::size_t>(std::min(now_.block_width, shape.width - x));
        for (int row = 0; row < rows; ++row) {
          std::memcpy(static_cast<char*>(pixels) + static_cast<std::size_t>(y - begin + row) * row_bytes +
                          static_cast<std::size_t>(x) * pixel_bytes,
                      tile_.data() + static_cast<std::size_t>(row) * tile_row_bytes, columns * pixel_bytes);
        }
      }
    }
    return Done{};
  }

  FrameFile file_;
  DiskFile bytes_;
  TiffHandle handle_;
  std::vector<std::uint64_t> directories_;  ///< of the frames seen so far
  std::uint64_t frontier_ = 0;              ///< directory read last on the way through the file
  std::uint64_t walked_ = 0;
  TiffPage now_;  ///< the current directory, if it is that of a page
  int now_page_ = 0;
  std::vector<char> tile_;
};

}  // namespace

Result<FrameFile> inspect_tiff(const std::filesystem::path& path) {
  const auto bytes = DiskFile::open(path);
  if (!bytes) return bytes.error();
  auto handle = TiffHandle::open(path, kReadMode, kDirectoryMemory, Errc::input);
  if (!handle) {
    Error error = handle.error();
    error.what += " (found " + std::to_string(bytes->size()) + " bytes)";
    return error;
  }
  FrameFile file{path, FileFormat::tiff, {}, {}};
  TIFF* tiff = handle->get();
  for (;;) {
    const int number = static_cast<int>(file.pages.size()) + 1;
    if (is_frame(*handle)) {
      if (file.pages.size() >= kMaxPages) {
        return damaged(path, number, *handle, "found more pages than " + std::to_string(kMaxPages));
      }
      auto page = read_tiff_page(*handle, path, bytes->size(), number);
      if (!page) return page.error();
      if (file.pages.empty()) file.header.acquired = page->acquired;
      file.pages.push_back(std::move(page->frame));
      if (page->planes > 1 && file.pages.size() == 1) {
        page->frame = file.pages.front();
        const Status planes = add_planes(file, *page, bytes->size());
        if (!planes) return planes.error();
      }
    }
    if (TIFFLastDirectory(tiff) != 0) {
      const Status whole = check_last_link(*bytes, tiff, number);
      if (!whole) return whole.error();
      break;
    }
    handle->forget();
    if (TIFFReadDirectory(tiff) == 0) {
      return damaged(path, static_cast<int>(file.pages.size()) + 1, *handle,
                     "found " + std::to_string(bytes->size()) + " bytes, expected a directory of tags here");
    }
  }
  if (file.pages.empty())
    return Error{Errc::input, {path, {}, {}, {}}, "found thumbnails only, expected a frame"};
  return file;
}

Result<std::unique_ptr<FrameDecoder>> open_tiff_decoder(const FrameFile& file) {
  auto bytes = DiskFile::open(file.path);
  if (!bytes) return bytes.error();
  // The library holds one compressed strip or tile at a time, which cannot be larger than the file.
  const std::uint64_t memory = std::max(kDirectoryMemory, bytes->size());
  auto handle = TiffHandle::open(file.path, kReadMode, memory, Errc::input);
  if (!handle) return handle.error();
  return std::unique_ptr<FrameDecoder>(
      std::make_unique<TiffDecoder>(file, std::move(*bytes), std::move(*handle)));
}

}  // namespace evenfield
