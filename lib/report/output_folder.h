#pragma once
/// The output folder appears whole or not at all: everything is written into DIR.partial-PID beside it, which
/// takes its place by a rename once it is complete.

#include <filesystem>
#include <string_view>

#include "base/error.h"

namespace evenfield {

/// True if `folder` was written by this program and holds nothing else, so that replacing it loses nothing of
/// the user's: a result.json that begins with our schema and otherwise only files that reports consist of; or
/// summary.csv and sub-folders that are ours.
bool is_own_output(const std::filesystem::path& folder);

class OutputFolder {
  std::filesystem::path target_;
  std::filesystem::path partial_;  // empty: committed or moved from

  OutputFolder(std::filesystem::path target, std::filesystem::path partial);

 public:
  /// Accepts a folder that does not exist yet (its parents are made), is empty, or is our own output. Error
  /// `output` for any other folder or file, for a mount point, and for the current folder or one above it, as
  /// those cannot be replaced.
  static Result<OutputFolder> begin(const std::filesystem::path& folder);

  OutputFolder(OutputFolder&& other) noexcept;
  OutputFolder& operator=(OutputFolder&& other) noexcept;
  OutputFolder(const OutputFolder&) = delete;
  OutputFolder& operator=(const OutputFolder&) = delete;
  ~OutputFolder();  ///< without commit(): removes what was written and leaves the old folder as it was

  /// Where to write until commit().
  const std::filesystem::path& path() const { return partial_; }

  /// Puts the new folder in place and removes the old one. After an error the old one is still there.
  Status commit();
};

/// Writes `text` as the whole of `file`. Error `output` with the system's reason, a full disk included; what
/// was written by then is removed.
Status write_text_file(const std::filesystem::path& file, std::string_view text);

}  // namespace evenfield
