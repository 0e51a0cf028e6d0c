#pragma once
/// Times of exposure as image headers write them, turned into RFC 3339. Headers without a zone mean UTC.

#include <optional>
#include <string>
#include <string_view>

namespace evenfield {

/// "2026-11-24T09:30:00.25" (FITS DATE-OBS, a zone allowed) -> "2026-11-24T09:30:00.25Z"; empty if it is no
/// date with a time.
std::optional<std::string> time_from_fits(std::string_view text);

/// "2026:11:24 09:30:00" (TIFF DateTime) -> "2026-11-24T09:30:00Z"; empty if it is not of that form.
std::optional<std::string> time_from_tiff(std::string_view text);

}  // namespace evenfield
