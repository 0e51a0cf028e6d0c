#pragma once
/// TIFF and BigTIFF stacks, one frame a page, through libtiff: one sample a pixel; 8, 16 and 32 bit integers,
/// 32 and 64 bit floats; strips and tiles; both byte orders; uncompressed, deflate, LZW and PackBits.
/// Thumbnails are skipped. All else is refused. Source: TIFF 6.0 and its technical notes.

#include <filesystem>
#include <memory>

#include "base/error.h"
#include "formats/frame_file.h"

namespace evenfield {

/// Time grows with the number of pages, not its square.
Result<FrameFile> inspect_tiff(const std::filesystem::path& path);

Result<std::unique_ptr<FrameDecoder>> open_tiff_decoder(const FrameFile& file);

}  // namespace evenfield
