#pragma once
/// What a header may claim before anything is allocated for it.

#include <cstdint>

#include "base/error.h"

namespace evenfield {

inline constexpr std::uint64_t kMaxFrameSide = 1'000'000;                  ///< pixels
inline constexpr std::uint64_t kMaxFramePixels = std::uint64_t{1} << 31U;  ///< width x height
inline constexpr std::uint64_t kMaxPages = 1'000'000;                      ///< frames of one file

/// Deflate cannot shrink data further than this (a match of 258 bytes takes at least 2 bits).
inline constexpr std::uint64_t kMaxDeflateRatio = 1032;

/// Error (input) at `where`, with the keys' names in its text, unless 1 <= width, height <= kMaxFrameSide and
/// the frame has at most kMaxFramePixels.
Status check_frame_size(std::uint64_t width, std::uint64_t height, const Where& where);

}  // namespace evenfield
