#include "formats/frame_limits.h"

#include <string>

namespace evenfield {

Status check_frame_size(std::uint64_t width, std::uint64_t height, const Where& where) {
  const std::string found = "found a frame of " + std::to_string(width) + " x " + std::to_string(height);
  if (width < 1 || height < 1 || width > kMaxFrameSide || height > kMaxFrameSide) {
    return Error{Errc::input, where, found + ", expected 1 to " + std::to_string(kMaxFrameSide) + " a side"};
  }
  if (width * height > kMaxFramePixels) {
    return Error{Errc::input, where,
                 found + ", expected at most " + std::to_string(kMaxFramePixels) + " pixels"};
  }
  return Done{};
}

}  // namespace evenfield
