#pragma once
/// Frames that lie in their file uncompressed: bytes by offset, then byte order and sign convention undone.

#include <cstddef>

#include "base/error.h"
#include "formats/disk_file.h"
#include "formats/frame_file.h"

namespace evenfield {

/// `pixels` pixels of `type`, as stored, become native numbers in place.
void decode_raw(void* data, std::size_t pixels, PixelType type, RawEncoding encoding);

/// The whole frame, whose extents must not be empty, as native pixels. Error (input) if bytes are missing.
Status read_raw_frame(const DiskFile& file, const FramePage& page, void* pixels);

}  // namespace evenfield
