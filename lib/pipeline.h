#pragma once
/// The whole run: frames in, characterization out.

#include <filesystem>
#include <optional>

#include "base/error.h"
#include "base/progress.h"
#include "result/characterization.h"

namespace evenfield {

/// Version of this program, "0.1.0".
const char* program_version();

struct MeasureOptions {
  int threads = 1;
  std::optional<std::filesystem::path> camera_file;  ///< its [camera] and [light] go over the session's
  Progress* progress = nullptr;                      ///< kept up to date, if given
  bool pictures = true;                              ///< what only pictures need is computed too
};

/// Measures the session that `session_file` describes. Memory does not grow with the number of series.
/// Errors: those of read_session, open_stack and accumulate; interrupted.
Result<Characterization> measure(const std::filesystem::path& session_file, const MeasureOptions& options);

}  // namespace evenfield
