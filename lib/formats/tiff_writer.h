#pragma once
/// TIFF and BigTIFF stacks through libtiff. The same frames and options give the same bytes: no dates, no
/// names.

#include <filesystem>
#include <memory>

#include "base/error.h"
#include "formats/frame_writer.h"

namespace evenfield {

/// Deflate and LZW are written with horizontal differences for integers. Errors (output).
Result<std::unique_ptr<FrameWriter>> create_tiff(const std::filesystem::path& path,
                                                 const FrameShape& shape,
                                                 int frames,
                                                 const WriteOptions& options);

}  // namespace evenfield
