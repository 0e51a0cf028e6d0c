#pragma once
/// What the directory of one TIFF page says, checked against the limits and against the bytes of the file.

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>

#include "base/error.h"
#include "formats/frame_file.h"
#include "formats/tiff_handle.h"

namespace evenfield {

struct TiffPage {
  FramePage frame;
  bool tiled = false;
  int block_width = 0;  ///< of a tile or strip, pixels
  int block_height = 0;
  std::optional<std::string> acquired;  ///< RFC 3339
  int planes = 1;  ///< frames of this size that lie behind each other from the one extent on
};

/// False for reduced copies of other pages (thumbnails) and masks, which are no frames.
bool is_frame(const TiffHandle& handle);

/// The current directory of `handle`, which is page `page` of `path`, a file of `file_bytes` bytes. Error
/// (input) names the tag, what was found and what was expected.
Result<TiffPage> read_tiff_page(const TiffHandle& handle,
                                const std::filesystem::path& path,
                                std::uint64_t file_bytes,
                                int page);

}  // namespace evenfield
