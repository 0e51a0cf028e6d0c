#pragma once
/// Names of files by pattern: `*` for any characters, `?` for one, `[a-z]` for one of a set and `[!a-z]` for
/// one outside it, each within one component of the path, folders included. `[*]` stands for a star.
/// Characters are those of UTF-8. A leading dot is matched by a dot only. No `**`, no `~`, no variables, no
/// shell.

#include <filesystem>
#include <string_view>
#include <vector>

#include "base/error.h"

namespace evenfield {

/// Whether `text` holds any of the characters above.
bool is_glob(std::string_view text);

/// Whether one component of a path matches. Time grows as the product of the lengths, whatever the stars.
bool glob_matches(std::string_view pattern, std::string_view name);

/// All paths that match and are no folders, in byte order, component by component; each begins as `pattern`
/// does. A relative pattern is looked up below `base`. Nothing found is no error; a folder that cannot be
/// listed is one (input), and names that folder.
Result<std::vector<std::filesystem::path>> expand_glob(const std::filesystem::path& base,
                                                       const std::filesystem::path& pattern);

}  // namespace evenfield
