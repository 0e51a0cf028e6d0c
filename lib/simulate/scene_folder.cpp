#include "simulate/scene_folder.h"

#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <fstream>
#include <optional>
#include <string>
#include <system_error>
#include <utility>
#include <vector>

#include "simulate/truth_json.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

Error output_error(const fs::path& path, std::string what) {
  return {Errc::output, {path, {}, {}, {}}, std::move(what)};
}

Error system_error(const fs::path& path, int number, const std::string& expected) {
  return output_error(path,
                      "found \"" + std::generic_category().message(number) + "\", expected " + expected);
}

/// Why the new folder may not take the place of `target`; absent if it may.
std::optional<std::string> obstacle(const fs::path& target) {
  std::error_code failed;
  const fs::file_status status = fs::symlink_status(target, failed);
  if (!fs::exists(status)) return std::nullopt;
  if (!fs::is_directory(status)) return "found a file, expected a folder or nothing";
  const fs::path current = fs::current_path(failed);
  if (std::mismatch(target.begin(), target.end(), current.begin(), current.end()).first == target.end())
    return "found the current folder or one above it, expected a folder that can be replaced";
  if (fs::is_empty(target, failed) && !failed) return std::nullopt;
  const auto own = truth_files(target / kTruthFileName);
  if (!own)
    return "found a folder that is no simulated session, expected an empty or a new one, or one to replace";
  for (fs::directory_iterator entry(target, failed), end; !failed && entry != end; entry.increment(failed)) {
    const std::string name = entry->path().filename().string();
    if (!fs::is_regular_file(entry->symlink_status(failed)) ||
        std::find(own->begin(), own->end(), name) == own->end())
      return "found \"" + name +
             "\" beside the files of a simulated session, expected nothing else to be lost";
  }
  if (failed) return "found a folder that cannot be listed, expected one that can be replaced";
  return std::nullopt;
}

}  // namespace

SceneFolder::SceneFolder(fs::path target, fs::path partial)
    : target_(std::move(target)), partial_(std::move(partial)) {}
SceneFolder::SceneFolder(SceneFolder&& other) noexcept
    : target_(std::move(other.target_)), partial_(std::exchange(other.partial_, {})) {}
SceneFolder::~SceneFolder() {
  std::error_code ignored;  // nobody to tell; what stays is named DIR.partial-PID
  if (!partial_.empty()) fs::remove_all(partial_, ignored);
}

Result<SceneFolder> SceneFolder::begin(const fs::path& folder) {
  if (folder.empty())
    return Error{Errc::output, {{}, {}, {}, "output folder"}, "found an empty name, expected a folder"};
  std::error_code failed;
  fs::path target = fs::weakly_canonical(fs::absolute(folder, failed), failed);
  if (failed)
    return output_error(folder, "found \"" + failed.message() + "\", expected a folder that can be made");
  if (target.filename().empty()) target = target.parent_path();
  if (auto found = obstacle(target)) return output_error(folder, std::move(*found));
  fs::create_directories(target.parent_path(), failed);
  if (failed)
    return output_error(target.parent_path(),
                        "found \"" + failed.message() + "\", expected a folder to write in");
  // A number behind the process id: one process may write several sessions, and a crash may have left one.
  for (int attempt = 0; attempt < 100; ++attempt) {
    fs::path partial = target;
    partial += ".partial-" + std::to_string(::getpid()) + (attempt == 0 ? "" : "-" + std::to_string(attempt));
    if (::mkdir(partial.c_str(), 0777) == 0) return SceneFolder(std::move(target), std::move(partial));
    if (errno != EEXIST) return system_error(partial, errno, "a folder that can be made");
  }
  return output_error(target, "found 100 unfinished folders beside it, expected room for a new one");
}

Status SceneFolder::commit() {
  if (auto found = obstacle(target_)) return output_error(target_, std::move(*found));
  std::error_code failed;
  fs::path old;
  if (fs::exists(target_, failed) && !fs::is_empty(target_, failed)) {
    old = partial_;
    old += ".replaced";
    if (::rename(target_.c_str(), old.c_str()) != 0)
      return system_error(target_, errno, "a folder that can be replaced");
  }
  if (::rename(partial_.c_str(), target_.c_str()) != 0) {
    const int number = errno;
    if (!old.empty()) fs::rename(old, target_, failed);
    return system_error(target_, number, "a folder that can be put in place");
  }
  partial_.clear();
  if (old.empty()) return Done{};
  fs::remove_all(old, failed);
  if (failed)
    return output_error(old, "found \"" + failed.message() + "\", expected to remove the old session");
  return Done{};
}

Status SceneFolder::write(const char* name, std::string_view text) const {
  const fs::path file = partial_ / name;
  std::ofstream stream(file, std::ios::binary | std::ios::trunc);
  errno = 0;
  stream.write(text.data(), static_cast<std::streamsize>(text.size()));
  stream.close();
  if (stream) return Done{};
  return system_error(file, errno == 0 ? EIO : errno, "a file that can be written");
}

}  // namespace evenfield
