#pragma once
/// The files that the `files` lists of a session lead to.

#include <filesystem>
#include <string>
#include <vector>

#include "base/error.h"
#include "formats/toml_document.h"
#include "ingest/session.h"

namespace evenfield {

/// The `files` of one [[series]], as written.
struct SeriesFileNames {
  TomlTable table;
  std::vector<std::string> names;
};

struct SeriesFiles {
  std::vector<SessionFile> files;           ///< each once, in order of first use
  std::vector<std::vector<int>> of_series;  ///< indices into `files`, for each series in order, none twice
};

/// Paths and globs of `lists`, relative ones from the folder of `session_file`. A name that exists is taken
/// as it is, whatever characters it has. Two paths are the same file if they lead, symbolic links followed,
/// to the same place. Errors (input) name the entry of the list: no such file, a glob that matches nothing,
/// no regular file, a file that two series have.
Result<SeriesFiles> find_series_files(const std::filesystem::path& session_file,
                                      const std::vector<SeriesFileNames>& lists);

}  // namespace evenfield
