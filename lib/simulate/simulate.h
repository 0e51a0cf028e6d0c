#pragma once
/// From a scene to a folder of frames: the frame files, session.toml, and truth.json.

#include <filesystem>
#include <functional>

#include "base/error.h"
#include "simulate/scene.h"

namespace evenfield {

struct SimulateOptions {
  int threads = 1;
  /// Called after each frame, one call at a time; an answer of false stops the work (Errc::interrupted).
  std::function<bool(int frames_done, int frames)> progress;
};

/// Writes the session into `folder`, which appears whole or not at all; one that simulate() wrote, and that
/// holds nothing else, is replaced. The same scene gives the same bytes, whatever the number of threads.
/// Memory: the sensor, and a frame a thread. Errors: output, with the file and the system's reason;
/// interrupted.
Status simulate(const Scene& scene, const std::filesystem::path& folder, const SimulateOptions& options);

}  // namespace evenfield
