#pragma once
/// FITS images, through CFITSIO: the primary and all image extensions, each plane of a cube a page; 8, 16 and
/// 32 bit integers, 32 and 64 bit floats; plain, tile-compressed with Rice or gzip, or packed with gzip as a
/// whole file. Numbers scaled by BZERO and BSCALE become 64 bit floats, except that the unsigned (and signed
/// byte) convention keeps its integers. Undefined pixels (BLANK) of integers are an error when they occur.
/// Source: FITS Standard 4.0, sections 4.4, 5.2.5, 7.1 and 10.

#include <filesystem>
#include <memory>

#include "base/error.h"
#include "formats/frame_file.h"

namespace evenfield {

/// A packed file is unpacked on the way, but not kept.
Result<FrameFile> inspect_fits(const std::filesystem::path& path, bool packed);

/// A packed file is unpacked into a temporary file that lives as long as the decoder.
Result<std::unique_ptr<FrameDecoder>> open_fits_decoder(const FrameFile& file, bool packed);

}  // namespace evenfield
