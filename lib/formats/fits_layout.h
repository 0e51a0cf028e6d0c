#pragma once
/// Where the header and the data of each part (HDU) of a FITS file lie, found by walking through it once,
/// forwards only, so that it works on a stream that is being unpacked as well. Every part is checked against
/// the bytes that are really there.  Source: FITS Standard 4.0, sections 3 and 4.4.1.

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <functional>
#include <string>
#include <vector>

#include "base/error.h"

namespace evenfield {

inline constexpr std::size_t kFitsBlock = 2880;  ///< bytes; headers and data are padded to this

enum class FitsPart { image, table, other };

struct FitsHdu {
  FitsPart part = FitsPart::image;
  std::uint64_t data_offset = 0;
  std::uint64_t data_bytes = 0;  ///< without padding; 0 if there is none
};

/// The bytes of a FITS file in order.
struct FitsStream {
  /// Up to `bytes` bytes into `to`; fewer only at the end.
  std::function<Result<std::size_t>(char* to, std::size_t bytes)> read;
  /// Passes over up to `bytes` bytes; answers how many there were.
  std::function<Result<std::uint64_t>(std::uint64_t bytes)> skip;
  std::uint64_t most_bytes = 0;  ///< no part can be larger than this
  std::string found;             ///< what there is, for messages: "5760 bytes"
};

/// Errors (input) name the part as the page (the primary is 1) and the keyword: not FITS, cut off ("found N
/// bytes, expected at least M"), damaged, anything but padding behind the last part.
Result<std::vector<FitsHdu>> read_fits_layout(const std::filesystem::path& path, const FitsStream& stream);

}  // namespace evenfield
