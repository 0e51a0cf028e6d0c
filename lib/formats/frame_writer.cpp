#include "formats/frame_writer.h"

#include "formats/fits_writer.h"
#include "formats/frame_limits.h"
#include "formats/tiff_writer.h"

namespace evenfield {

Result<std::unique_ptr<FrameWriter>> create_frames(const std::filesystem::path& path,
                                                   const FrameShape& shape,
                                                   int frames,
                                                   const WriteOptions& options) {
  const Where where{path, {}, {}, {}};
  // A size below zero wraps around and is beyond the limit.
  Status size = check_frame_size(static_cast<std::uint64_t>(shape.width),
                                 static_cast<std::uint64_t>(shape.height), where);
  if (!size) return Error{Errc::output, where, size.error().what};
  if (frames < 1 || static_cast<std::uint64_t>(frames) > kMaxPages) {
    return Error{Errc::output, where,
                 "found " + std::to_string(frames) + " frames, expected 1 to " + std::to_string(kMaxPages)};
  }
  return options.format == WriteFormat::tiff ? create_tiff(path, shape, frames, options)
                                             : create_fits(path, shape, frames, options);
}

}  // namespace evenfield
