#include "formats/toml_scan.h"

#include <algorithm>
#include <string>

namespace evenfield {
namespace {

/// Position behind the string that starts with the quote at text[i]; counts the lines it crosses.
std::size_t skip_string(std::string_view text, std::size_t i, int& line) {
  const char quote = text[i];
  const std::string triple(3, quote);
  const bool many_lines = text.compare(i, 3, triple) == 0;
  i += many_lines ? 3 : 1;
  while (i < text.size()) {
    if (text[i] == '\n') {
      if (!many_lines) return i;
      ++line;
    }
    if (text[i] == '\\' && quote == '"') {
      i += i + 1 < text.size() && text[i + 1] == '\n'
               ? 1
               : 2;  // the line end itself is counted by the next round
    } else if (text[i] == quote && !many_lines) {
      return i + 1;
    } else if (many_lines && text.compare(i, 3, triple) == 0) {
      i += 3;
      for (int extra = 0; extra < 2 && i < text.size() && text[i] == quote; ++extra) ++i;
      return i;
    } else {
      ++i;
    }
  }
  return i;
}

bool is_bare(char c) {
  return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_' || c == '-';
}

}  // namespace

std::optional<TomlObstacle> find_toml_obstacle(std::string_view text, int max_parts) {
  int line = 1;
  int dots = 0;
  std::string open;  // brackets and braces, outermost first
  for (std::size_t i = 0; i < text.size();) {
    const char c = text[i];
    if (c == '#') {
      i = std::min(text.find('\n', i), text.size());
      continue;
    }
    if (c == '"' || c == '\'') {
      i = skip_string(text, i, line);
      continue;
    }
    if (c == '.') {
      if (++dots >= max_parts)
        return TomlObstacle{
            line, "found a key of more than " + std::to_string(max_parts) + " parts, expected no more"};
    } else if (!is_bare(c) && c != ' ' && c != '\t') {
      dots = 0;
    }
    if (c == '[' || c == '{') open += c;
    if ((c == ']' || c == '}') && !open.empty()) {
      const char wanted = open.back() == '[' ? ']' : '}';
      if (c != wanted) return TomlObstacle{line, std::string("found ") + c + ", expected " + wanted};
      open.pop_back();
    }
    if (c == '\n') ++line;
    ++i;
  }
  return std::nullopt;
}

}  // namespace evenfield
