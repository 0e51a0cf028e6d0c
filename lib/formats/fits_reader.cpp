#include "formats/fits_reader.h"

#include <algorithm>
#include <limits>
#include <utility>
#include <vector>

#include "formats/disk_file.h"
#include "formats/fits_image.h"
#include "formats/fits_layout.h"
#include "formats/fits_tiles.h"
#include "formats/gunzip.h"
#include "formats/raw_pixels.h"

namespace evenfield {

namespace {

/// An open file, unpacked if need be, and the images in it.
struct OpenFits {
  DiskFile bytes;
  FitsHandle handle;
  std::vector<FitsImage> images;
  FrameHeader header;
};

Result<std::vector<FitsHdu>> layout_of(const DiskFile& file) {
  std::uint64_t position = 0;
  FitsStream stream;
  stream.read = [&](char* to, std::size_t bytes) {
    auto got = file.read_some(position, to, bytes);
    if (got) position += *got;
    return got;
  };
  stream.skip = [&](std::uint64_t bytes) -> Result<std::uint64_t> {
    const std::uint64_t there = file.size() - std::min(file.size(), position);
    const std::uint64_t passed = std::min(bytes, there);
    position += passed;
    return passed;
  };
  stream.most_bytes = file.size();
  stream.found = std::to_string(file.size()) + " bytes";
  return read_fits_layout(file.path(), stream);
}

Result<OpenFits> open_images(DiskFile bytes,
                             const std::vector<FitsHdu>& parts,
                             const std::filesystem::path& path) {
  auto handle = open_fits(path, bytes.name_for_library());
  if (!handle) return handle.error();
  auto images = read_fits_images(path, handle->get(), parts);
  if (!images) return images.error();
  return OpenFits{std::move(bytes), std::move(*handle), std::move(images->images), {images->acquired}};
}

Result<OpenFits> open_file(const std::filesystem::path& path, bool packed, Unpack what) {
  if (packed) {
    auto unpacked = unpack_fits(path, what);
    if (!unpacked) return unpacked.error();
    return open_images(std::move(unpacked->file), unpacked->parts, path);
  }
  auto bytes = DiskFile::open(path);
  if (!bytes) return bytes.error();
  const auto parts = layout_of(*bytes);
  if (!parts) return parts.error();
  return open_images(std::move(*bytes), *parts, path);
}

/// Plane `plane` of `image` as a page of the file.
FramePage page_of(const FitsImage& image, std::uint64_t plane, bool packed) {
  FramePage page;
  page.shape = image.shape;
  if (!image.raw) {
    if (!packed) page.rows_apart = fits_rows_apart(image);
    return page;
  }
  page.encoding = image.encoding;
  if (packed) return page;
  const std::uint64_t bytes = static_cast<std::uint64_t>(image.shape.width) *
                              static_cast<std::uint64_t>(image.shape.height) *
                              bytes_per_pixel(image.shape.type);
  page.extents.push_back({0, image.shape.height, image.data_offset + plane * bytes});
  return page;
}

class FitsDecoder : public FrameDecoder {
 public:
  FitsDecoder(const FrameFile& file, OpenFits open) : path_(file.path), open_(std::move(open)) {
    for (const FitsImage& image : open_.images) {
      first_pages_.push_back(pages_);
      pages_ += image.planes;
    }
  }

  Status decode(int page, void* pixels) override {
    return decode_rows(page, 0, std::numeric_limits<int>::max(), pixels);
  }

  Status decode_rows(int page, int first_row, int rows, void* pixels) override {
    const Where where{path_, {}, page, {}};
    if (page < 1 || static_cast<std::uint64_t>(page) > pages_) {
      return Error{Errc::input, where,
                   "found " + std::to_string(pages_) + " frames, expected this one among them"};
    }
    const auto index = static_cast<std::uint64_t>(page) - 1;
    const auto after = std::upper_bound(first_pages_.begin(), first_pages_.end(), index);
    const auto number = static_cast<std::size_t>(after - first_pages_.begin()) - 1;
    const FitsImage& image = open_.images[number];
    const std::uint64_t plane = index - first_pages_[number];
    const int count = std::min(rows, image.shape.height - first_row);
    Status read = image.raw ? read_raw_frame(open_.bytes, page_of(image, plane, false), pixels)
                            : decode_packed(page, image, plane, first_row, count, pixels);
    if (read) return read;
    Error error = read.error();
    error.where.file = path_;
    error.where.page = page;
    return error;
  }

 private:
  Status decode_packed(
      int page, const FitsImage& image, std::uint64_t plane, int first_row, int rows, void* pixels) {
    if (!image.tile.empty() && checked_page_ != page) {
      int status = 0;
      fits_movabs_hdu(open_.handle.get(), image.hdu, nullptr, &status);
      if (status != 0) return Error{Errc::input, {}, "cannot be decoded: " + fits_words(status)};
      Status whole = check_gzip_tiles(open_.handle.get(), image, plane);
      if (!whole) return whole;
      checked_page_ = page;
    }
    return read_fits_rows(open_.handle.get(), image, plane, first_row, rows, pixels);
  }

  std::filesystem::path path_;
  OpenFits open_;
  int checked_page_ = 0;                    ///< its gzip tiles are whole
  std::vector<std::uint64_t> first_pages_;  ///< index of each image's first plane
  std::uint64_t pages_ = 0;
};

}  // namespace

Result<FrameFile> inspect_fits(const std::filesystem::path& path, bool packed) {
  const auto open = open_file(path, packed, Unpack::headers);
  if (!open) return open.error();
  FrameFile file{path, FileFormat::fits, {}, open->header, packed};
  for (const FitsImage& image : open->images) {
    for (std::uint64_t plane = 0; plane < image.planes; ++plane)
      file.pages.push_back(page_of(image, plane, packed));
  }
  if (file.pages.empty())
    return Error{Errc::input, {path, {}, {}, {}}, "found no image with pixels, expected one"};
  return file;
}

Result<std::unique_ptr<FrameDecoder>> open_fits_decoder(const FrameFile& file, bool packed) {
  auto open = open_file(file.path, packed, Unpack::all);
  if (!open) return open.error();
  std::size_t index = 0;
  for (const FitsImage& image : open->images) {
    for (std::uint64_t plane = 0; plane < image.planes; ++plane, ++index) {
      if (index >= file.pages.size() || file.pages[index].shape != image.shape) {
        return Error{
            Errc::input, {file.path, {}, static_cast<int>(index) + 1, {}}, "changed while it was read"};
      }
    }
  }
  if (index != file.pages.size())
    return Error{Errc::input, {file.path, {}, {}, {}}, "changed while it was read"};
  return std::unique_ptr<FrameDecoder>(std::make_unique<FitsDecoder>(file, std::move(*open)));
}

}  // namespace evenfield
