#include "ingest/glob.h"

#include <algorithm>
#include <string>
#include <system_error>

namespace evenfield {
namespace {

namespace fs = std::filesystem;

/// Characters of UTF-8; a byte that is none of it stands for itself, outside Unicode, so that any name can
/// match.
std::u32string characters(std::string_view text) {
  constexpr char32_t kLooseByte = 0x110000;
  std::u32string out;
  for (std::size_t i = 0; i < text.size();) {
    const auto lead = static_cast<unsigned char>(text[i]);
    const std::size_t more = lead >= 0xF0 ? 3 : lead >= 0xE0 ? 2 : lead >= 0xC0 ? 1 : 0;
    char32_t value = more == 0 ? lead : lead & (0x3FU >> more);
    bool whole = i + more < text.size() && (lead < 0x80 || lead >= 0xC0);
    for (std::size_t k = 1; whole && k <= more; ++k) {
      const auto next = static_cast<unsigned char>(text[i + k]);
      whole = (next & 0xC0U) == 0x80U;
      value = value << 6U | (next & 0x3FU);
    }
    out += whole ? value : kLooseByte + lead;
    i += whole ? more + 1 : 1;
  }
  return out;
}

/// A `[...]` that starts at pattern[at]: where it ends, and whether `c` is in it. Without a closing bracket
/// the opening one is an ordinary character.
struct SetMatch {
  std::size_t end;
  bool inside;
};

SetMatch match_set(const std::u32string& pattern, std::size_t at, char32_t c) {
  std::size_t i = at + 1;
  const bool negated = i < pattern.size() && (pattern[i] == U'!' || pattern[i] == U'^');
  if (negated) ++i;
  const std::size_t close = pattern.find(U']', i + 1);  // a bracket that comes first is a member
  if (close == std::u32string::npos) return {at + 1, c == U'['};
  bool inside = false;
  while (i < close) {
    const bool range = i + 2 < close && pattern[i + 1] == U'-';
    const char32_t last = range ? pattern[i + 2] : pattern[i];
    inside = inside || (pattern[i] <= c && c <= last);
    i += range ? 3 : 1;
  }
  return {close + 1, inside != negated};
}

Result<std::vector<fs::path>> names_in(const fs::path& folder) {
  std::error_code code;
  std::vector<fs::path> names;
  for (fs::directory_iterator entry(folder, code), end; !code && entry != end; entry.increment(code))
    names.push_back(entry->path().filename());
  if (code)
    return Error{Errc::input,
                 {folder, {}, {}, {}},
                 "found a folder that cannot be listed (" + code.message() + "), expected a readable one"};
  std::sort(names.begin(), names.end(),
            [](const fs::path& a, const fs::path& b) { return a.native() < b.native(); });
  return names;
}

}  // namespace

bool is_glob(std::string_view text) { return text.find_first_of("*?[") != std::string_view::npos; }

bool glob_matches(std::string_view pattern_text, std::string_view name_text) {
  const std::u32string pattern = characters(pattern_text);
  const std::u32string name = characters(name_text);
  if (!name.empty() && name[0] == U'.' && (pattern.empty() || pattern[0] != U'.')) return false;
  // Going back to the last star only is enough: an earlier star could give nothing that a later one cannot.
  std::size_t p = 0, n = 0, behind_star = std::u32string::npos, star_takes = 0;
  while (n < name.size()) {
    if (p < pattern.size() && pattern[p] == U'*') {
      behind_star = ++p;
      star_takes = n;
      continue;
    }
    SetMatch step{p + 1, false};
    if (p < pattern.size())
      step = pattern[p] == U'[' ? match_set(pattern, p, name[n])
                                : SetMatch{p + 1, pattern[p] == U'?' || pattern[p] == name[n]};
    if (step.inside) {
      p = step.end;
      ++n;
    } else if (behind_star != std::u32string::npos) {
      p = behind_star;
      n = ++star_takes;
    } else {
      return false;
    }
  }
  while (p < pattern.size() && pattern[p] == U'*') ++p;
  return p == pattern.size();
}

Result<std::vector<fs::path>> expand_glob(const fs::path& base, const fs::path& pattern) {
  std::vector<fs::path> found{pattern.root_path()};
  const fs::path below = pattern.relative_path();
  for (auto part = below.begin(); part != below.end(); ++part) {
    const bool last = std::next(part) == below.end();
    std::vector<fs::path> next;
    for (const fs::path& prefix : found) {
      std::error_code code;
      if (!is_glob(part->native())) {
        const fs::path candidate = prefix / *part;
        if (!last || fs::symlink_status(base / candidate, code).type() != fs::file_type::not_found)
          next.push_back(candidate);
        continue;
      }
      const fs::path folder = (base / prefix).empty() ? fs::path(".") : base / prefix;
      if (fs::status(folder, code).type() == fs::file_type::not_found) continue;
      // A plain file where the pattern has a folder matches nothing; that is no folder which cannot be
      // listed.
      if (!fs::is_directory(folder, code) && !code) continue;
      const auto names = names_in(folder);
      if (!names) return names.error();
      for (const fs::path& name : *names)
        if (glob_matches(part->native(), name.native())) next.push_back(prefix / name);
    }
    found = std::move(next);
  }
  std::erase_if(found, [&base](const fs::path& path) {
    std::error_code code;
    return fs::is_directory(base / path, code);
  });
  return found;
}

}  // namespace evenfield
