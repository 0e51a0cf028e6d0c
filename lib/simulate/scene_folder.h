#pragma once
/// The folder of a simulated session: it appears whole or not at all.

#include <filesystem>
#include <string_view>

#include "base/error.h"

namespace evenfield {

/// Written beside its place as DIR.partial-PID, put there by commit(); without commit() removed again.
class SceneFolder {
  std::filesystem::path target_;
  std::filesystem::path partial_;  // empty: committed or moved from

  SceneFolder(std::filesystem::path target, std::filesystem::path partial);

 public:
  /// Accepts a folder that does not exist yet (its parents are made), is empty, or was written by simulate()
  /// and holds nothing else. Error (output) otherwise.
  static Result<SceneFolder> begin(const std::filesystem::path& folder);

  SceneFolder(SceneFolder&& other) noexcept;
  SceneFolder& operator=(SceneFolder&&) = delete;
  SceneFolder(const SceneFolder&) = delete;
  SceneFolder& operator=(const SceneFolder&) = delete;
  ~SceneFolder();

  const std::filesystem::path& path() const { return partial_; }  ///< where to write until commit()

  /// Puts the new folder in place and removes the old one; after an error the old one is still there.
  Status commit();

  /// Writes a text file into path(). Error (output) with the system's reason.
  Status write(const char* name, std::string_view text) const;
};

}  // namespace evenfield
