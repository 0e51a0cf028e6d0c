#pragma once
/// A look at TOML text for what the parser does not stand, before it sees it:
/// - dotted keys without limit, each part of which is a table inside a table, taken down by recursion: a line
/// of a
///   million dots would overflow the stack;
/// - a brace that closes a list, on which it runs into its own assertions.

#include <optional>
#include <string>
#include <string_view>

namespace evenfield {

struct TomlObstacle {
  int line;          ///< from 1
  std::string what;  ///< "found ..., expected ..."
};

/// The first of these in `text`, keys being allowed `max_parts` parts. Valid TOML has only the first kind.
std::optional<TomlObstacle> find_toml_obstacle(std::string_view text, int max_parts);

}  // namespace evenfield
