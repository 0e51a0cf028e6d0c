#pragma once
/// FITS files packed with gzip, unpacked by ourselves: never more than their headers promise, never into
/// memory. Source: RFC 1952; FITS Standard 4.0.

#include <filesystem>
#include <vector>

#include "base/error.h"
#include "formats/disk_file.h"
#include "formats/fits_layout.h"

namespace evenfield {

struct UnpackedFits {
  DiskFile file;  ///< temporary
  std::vector<FitsHdu> parts;
};

/// What to keep. `headers` leaves holes where the data were, so that it costs time, but no space.
enum class Unpack { headers, all };

/// Errors (input): damaged or cut off gzip data, and all of read_fits_layout(); (output) no space.
Result<UnpackedFits> unpack_fits(const std::filesystem::path& path, Unpack what);

}  // namespace evenfield
