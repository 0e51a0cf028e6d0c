#include "ingest/session_files.h"

#include <algorithm>
#include <optional>
#include <system_error>
#include <unordered_map>
#include <utility>

#include "base/text.h"
#include "ingest/glob.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

std::string in_quotes(const std::string& text) { return '"' + text + '"'; }

/// Why `path` cannot be a frame file; absent if it can.
std::optional<std::string> objection(const fs::path& path, const std::string& written) {
  std::error_code code;
  const fs::file_status status = fs::status(path, code);
  switch (status.type()) {
    case fs::file_type::regular:
      return std::nullopt;
    case fs::file_type::not_found:
      return "found no file " + in_quotes(written) + ", expected one";
    case fs::file_type::directory:
      return "found the folder " + in_quotes(written) + ", expected a file or a glob";
    case fs::file_type::none:
      return "found that " + in_quotes(written) + " cannot be looked up (" + code.message() +
             "), expected a file";
    default:
      return "found that " + in_quotes(written) + " is a device, pipe or socket, expected a file";
  }
}

/// What the entry `name` leads to, each as one would write it; or, as an error without a place, why nothing.
Result<std::vector<fs::path>> expand(const fs::path& folder, const std::string& name) {
  const auto failed = [](std::string what) { return Error{Errc::input, {}, std::move(what)}; };
  if (name.empty()) return failed("found an empty string, expected a path or a glob");
  if (name.find('\0') != std::string::npos) return failed("found a NUL character, expected a path or a glob");
  std::error_code code;
  const bool exists = fs::symlink_status(folder / name, code).type() != fs::file_type::not_found;
  if (exists || !is_glob(name)) return std::vector<fs::path>{name};
  auto matches = expand_glob(folder, name);
  if (!matches) return failed(to_line(matches.error()));
  if (matches->empty())
    return failed("found no file that matches " + in_quotes(name) + ", expected at least one");
  return matches;
}

/// As results show it: relative to the session's folder when inside it, else as written.
std::string shown(const fs::path& absolute_folder, const fs::path& written) {
  const fs::path inside = (absolute_folder / written).lexically_normal().lexically_relative(absolute_folder);
  const bool leaves = inside.empty() || *inside.begin() == "..";
  return escape_control(leaves ? written.string() : inside.string());
}

}  // namespace

Result<SeriesFiles> find_series_files(const fs::path& session_file,
                                      const std::vector<SeriesFileNames>& lists) {
  const fs::path folder = session_file.parent_path();
  std::error_code code;
  fs::path absolute_folder = fs::absolute(session_file, code).lexically_normal().parent_path();
  SeriesFiles out;
  struct Use {
    int file;
    std::size_t series;
  };
  std::unordered_map<std::string, Use> known;
  for (std::size_t series = 0; series < lists.size(); ++series) {
    const auto& [table, names] = lists[series];
    std::vector<int>& own = out.of_series.emplace_back();
    for (std::size_t entry = 0; entry < names.size(); ++entry) {
      const auto failed = [&table = table, entry](std::string what) {
        return Error{Errc::input, table.where("files[" + std::to_string(entry + 1) + ']'), std::move(what)};
      };
      const auto paths = expand(folder, names[entry]);
      if (!paths) return failed(paths.error().what);
      for (const fs::path& written : *paths) {
        const fs::path path = folder / written;
        if (const auto reason = objection(path, written.string())) return failed(*reason);
        fs::path place = fs::canonical(path, code);
        if (code) place = fs::absolute(path).lexically_normal();
        const auto [use, is_new] =
            known.try_emplace(place.native(), Use{static_cast<int>(out.files.size()), series});
        if (is_new) {
          out.files.push_back({path, shown(absolute_folder, written)});
          own.push_back(use->second.file);
        } else if (use->second.series != series) {
          return failed("found " + in_quotes(written.string()) + ", which series[" +
                        std::to_string(use->second.series + 1) +
                        "] has too, expected each file in one series");
        }
      }
    }
  }
  return out;
}

}  // namespace evenfield
