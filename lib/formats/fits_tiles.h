#pragma once
/// The packed tiles of a compressed FITS image, looked at before CFITSIO is let near them: version 4.2 grows
/// its buffer without end on a tile of gzip data that is cut off or damaged, and on one that unpacks to too
/// much. Include it in sources only (see fits_handle.h).   Source: FITS Standard 4.0, section 10.

#include <cstdint>

#include "base/error.h"
#include "formats/fits_image.h"

namespace evenfield {

/// Error (input), without place, if a tile of plane `plane` (from 0) that gzip packed is not whole, or larger
/// than a tile can be. `handle` stands at the image's part.
Status check_gzip_tiles(fitsfile* handle, const FitsImage& image, std::uint64_t plane);

}  // namespace evenfield
