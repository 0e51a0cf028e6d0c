#pragma once
/// The images of an open FITS file, as their headers describe them. Include it in sources only (see
/// fits_handle.h).

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/error.h"
#include "base/image.h"
#include "formats/fits_handle.h"
#include "formats/fits_layout.h"
#include "formats/frame_file.h"

namespace evenfield {

struct FitsImage {
  int hdu = 1;               ///< from 1
  FrameShape shape;          ///< of each plane
  std::vector<long> axes;    ///< NAXISn, at least two
  std::uint64_t planes = 1;  ///< product of the axes from the third on
  bool raw = false;          ///< planes lie in the file as they are, from data_offset on
  std::uint64_t data_offset = 0;
  RawEncoding encoding;
  std::vector<long> tile;        ///< ZTILEn of a compressed image; else empty
  bool gzip = false;             ///< compressed with gzip
  std::uint64_t data_bytes = 0;  ///< of the part, padding left out
};

struct FitsImages {
  std::vector<FitsImage> images;        ///< in file order
  std::optional<std::string> acquired;  ///< RFC 3339, the first of any part: of the primary, if it has one
};

/// Opens `name` as it stands, without CFITSIO's extended file names. Error (input) for `path`.
Result<FitsHandle> open_fits(const std::filesystem::path& path, const std::string& name);

/// All images; tables and empty parts are skipped. Errors (input) name part and keyword.
Result<FitsImages> read_fits_images(const std::filesystem::path& path,
                                    fitsfile* handle,
                                    const std::vector<FitsHdu>& parts);

/// Rows of a compressed image that decode apart from the others (see FramePage), or 0.
int fits_rows_apart(const FitsImage& image);

/// Rows [first_row, first_row + rows) of plane `plane` (from 0) of `image` as native pixels. Tiles that gzip
/// packed must have been checked. Error (input), without place: file and page are the caller's.
Status read_fits_rows(
    fitsfile* handle, const FitsImage& image, std::uint64_t plane, int first_row, int rows, void* pixels);

}  // namespace evenfield
