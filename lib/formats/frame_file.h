#pragma once
/// Files that hold frames: what their headers say, and how to get at their pixels.
///
/// A frame is one grey-scale image: a page of a TIFF file, or a plane of an image of a FITS file. Pages are
/// numbered from 1 in file order; a FITS cube counts plane by plane. Only headers are read by inspect().
/// Pixels that lie in the file uncompressed and row by row are described by extents, so that anyone can read
/// them by offset; all other pixels are decoded, a whole frame at a time or, where the file allows it, some
/// rows.

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "base/error.h"
#include "base/image.h"

namespace evenfield {

/// How stored bits become native numbers: swap bytes, then flip the highest bit.
struct RawEncoding {
  bool swap_bytes = false;     ///< stored byte order is not this machine's
  bool flip_sign_bit = false;  ///< the FITS convention for unsigned numbers (and signed bytes)
};

/// Rows [first_row, first_row + rows) lie at `offset`, `width` pixels each, without gaps.
struct RawExtent {
  int first_row = 0;
  int rows = 0;
  std::uint64_t offset = 0;
};

/// One frame in a file. `extents` is empty if the frame must be decoded.
struct FramePage {
  FrameShape shape;
  std::vector<RawExtent> extents;  ///< ascending, covering all rows, every byte inside the file; or empty
  RawEncoding encoding;
  /// Of a frame without extents: so many rows, from a multiple of it on, decode apart from all others at no
  /// extra cost. 0: they do not, or they are very many.
  int rows_apart = 0;
};

/// Rows that make up more bytes than this are not worth decoding apart.
inline constexpr std::uint64_t kMostBytesApart = std::uint64_t{1} << 20U;

enum class FileFormat { tiff, fits };

/// What headers say about the exposure, where they say it; used for what a session file leaves out.
struct FrameHeader {
  std::optional<std::string> acquired;  ///< RFC 3339, from DATE-OBS or DateTime; UTC is assumed
};

struct FrameFile {
  std::filesystem::path path;
  FileFormat format = FileFormat::tiff;
  std::vector<FramePage> pages;
  FrameHeader header;
  bool packed = false;  ///< as a whole: a decoder unpacks all of it before its first frame
};

/// Reads the headers of `path`. The format is told from the first bytes, not from the name. Errors (input)
/// name file, page and tag or keyword: not found, neither TIFF nor FITS, truncated, no frame inside, more
/// than one sample a pixel, a pixel type or compression outside the list, sizes outside limits.
Result<FrameFile> inspect(const std::filesystem::path& path);

/// Decodes frames of one file; for one thread at a time.
class FrameDecoder {
 public:
  virtual ~FrameDecoder() = default;
  /// Frame `page` (from 1) in whole, as native pixels of its shape, rows in order, into `pixels`, which holds
  /// width x height x bytes_per_pixel bytes. Works for every page, raw ones too.
  virtual Status decode(int page, void* pixels) = 0;
  /// Rows [first_row, first_row + rows) of a page with rows_apart: both are multiples of it, or the rows end
  /// with the frame.
  virtual Status decode_rows(int page, int first_row, int rows, void* pixels) = 0;
};
// Virtual, because two libraries' handles hide behind it.

Result<std::unique_ptr<FrameDecoder>> open_decoder(const FrameFile& file);

}  // namespace evenfield
