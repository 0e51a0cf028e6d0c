#pragma once
/// From a session file to a session whose frames are found, inspected and alike.

#include <filesystem>
#include <optional>
#include <string_view>
#include <vector>

#include "base/error.h"
#include "formats/frame_file.h"
#include "ingest/session.h"

namespace evenfield {

struct OpenedSession {
  Session session;
  std::vector<FrameFile> frame_files;  ///< index-aligned with Session::files
};

/// Smallest region, and so smallest frame, in pixels a side: one block of 64 pixels.
constexpr int kSmallestRegion = 8;

/// Reads `file`, finds the frames it names and inspects each of their files once, on `threads` threads. Keys
/// of [camera] and [light] in `camera_file` override those of the session. All errors are of kind input and
/// name file, line and key, or the frame's file and page: unknown or missing keys, values of a wrong type or
/// out of range, paths and globs that lead to no file, a file in two series, frames that differ in size or
/// pixel type, regions and overscans outside the frame or smaller than kSmallestRegion (an overscan: than 1),
/// flats without any dark or bias.
Result<OpenedSession> read_session(const std::filesystem::path& file,
                                   int threads,
                                   const std::optional<std::filesystem::path>& camera_file = std::nullopt);

/// The same from the text of a session file; `name` stands for it in errors, and its folder is where paths
/// start.
Result<OpenedSession> read_session_text(
    std::string_view text,
    const std::filesystem::path& name,
    int threads,
    const std::optional<std::filesystem::path>& camera_file = std::nullopt);

}  // namespace evenfield
