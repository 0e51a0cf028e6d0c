#pragma once
/// Writes stacks of frames, for simulated sessions and for tests.

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "base/error.h"
#include "base/image.h"

namespace evenfield {

enum class WriteFormat { tiff, fits };
enum class WriteCompression { none, deflate, lzw, packbits, rice, gzip };  ///< the last two FITS only

struct WriteOptions {
  WriteFormat format = WriteFormat::tiff;
  WriteCompression compression = WriteCompression::none;
  bool big_tiff = false;    ///< TIFF only
  bool big_endian = false;  ///< TIFF only
  int rows_per_strip = 0;   ///< TIFF only; 0: the whole frame if uncompressed, else 64
  int tile_size = 0;        ///< TIFF only; 0: strips
  bool extensions = false;  ///< FITS only: one image extension a frame instead of a cube
  std::vector<std::pair<std::string, std::string>> text_keywords{};  ///< FITS only, e.g. {"DATE-OBS", "..."}
  std::vector<std::pair<std::string, double>> number_keywords{};     ///< FITS only, e.g. {"EXPTIME", 0.01}
};

/// A stack of frames of one shape, written frame by frame. finish() must be called; without it the file is
/// incomplete. A cube's number of frames is known in advance.
class FrameWriter {
 public:
  virtual ~FrameWriter() = default;
  virtual Status add(const void* pixels) = 0;
  virtual Status finish() = 0;
};

Result<std::unique_ptr<FrameWriter>> create_frames(const std::filesystem::path& path,
                                                   const FrameShape& shape,
                                                   int frames,
                                                   const WriteOptions& options);

}  // namespace evenfield
