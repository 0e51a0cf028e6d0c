#pragma once
/// FITS files through CFITSIO: a cube, or an image extension a frame; plain or tile-compressed, always
/// without loss. The same frames and options give the same bytes.

#include <filesystem>
#include <memory>

#include "base/error.h"
#include "formats/frame_writer.h"

namespace evenfield {

/// Unsigned numbers (and signed bytes) by the BZERO convention. Rice holds integers only. Errors (output).
Result<std::unique_ptr<FrameWriter>> create_fits(const std::filesystem::path& path,
                                                 const FrameShape& shape,
                                                 int frames,
                                                 const WriteOptions& options);

}  // namespace evenfield
