#include "report/output_folder.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <fstream>
#include <system_error>
#include <utility>

#include "result/result_json.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

constexpr std::array<std::string_view, 7> kFiles{"result.json",  "quantities.csv", "series.csv",
                                                 "findings.csv", "defects.csv",    "report.html",
                                                 "summary.csv"};

Error output_error(const fs::path& path, std::string what) {
  return {Errc::output, {path, {}, {}, ""}, std::move(what)};
}

Error system_error(const fs::path& path, int number, const std::string& expected) {
  return output_error(path,
                      "found \"" + std::generic_category().message(number) + "\", expected " + expected);
}

bool holds_only(const fs::path& folder, std::string_view extension) {
  std::error_code failed;
  for (fs::directory_iterator it(folder, failed), end; !failed && it != end; it.increment(failed))
    if (!fs::is_regular_file(it->symlink_status(failed)) || it->path().extension() != extension) return false;
  return !failed;
}

/// to_json writes the schema first, so the first bytes decide; spaces are passed over in case a tool
/// reformatted it.
bool has_own_schema(const fs::path& file) {
  std::error_code failed;
  if (!fs::is_regular_file(fs::symlink_status(file, failed))) return false;
  std::ifstream stream(file, std::ios::binary);
  std::array<char, 256> bytes{};
  stream.read(bytes.data(), bytes.size());
  std::string start(bytes.data(), static_cast<std::size_t>(stream.gcount()));
  std::erase_if(start, [](char c) { return c == ' ' || c == '\n' || c == '\r' || c == '\t'; });
  const std::string_view family = kResultSchema.substr(0, kResultSchema.find('/') + 1);
  return start.starts_with("{\"schema\":\"" + std::string(family));
}

/// "" if the new folder may take the place of `target`, else what is in the way.
std::string obstacle(const fs::path& target) {
  std::error_code failed;
  const auto status = fs::symlink_status(target, failed);
  if (!fs::exists(status)) return "";
  if (!fs::is_directory(status)) return "found a file, expected a folder or nothing";
  const fs::path current = fs::current_path(failed);
  const auto inside = std::mismatch(target.begin(), target.end(), current.begin(), current.end());
  if (inside.first == target.end())
    return "found the current folder or one above it, expected a folder that can be replaced";
  struct stat here {
  }, above{};
  if (::stat(target.c_str(), &here) != 0 || ::stat(target.parent_path().c_str(), &above) != 0)
    return "found a folder that cannot be examined, expected one that can be replaced";
  if (here.st_dev != above.st_dev)
    return "found the top of a mounted file system, expected a folder below it that can be replaced";
  if (fs::is_empty(target, failed) && !failed) return "";
  if (is_own_output(target)) return "";
  return "found a folder that holds other files than the output of this program, expected an empty or a new "
         "one";
}

}  // namespace

bool is_own_output(const fs::path& folder) {
  std::error_code failed;
  bool own_below = true, has_summary = false;
  for (fs::directory_iterator it(folder, failed), end; !failed && it != end; it.increment(failed)) {
    const std::string name = it->path().filename().string();
    const auto status = it->symlink_status(failed);
    const bool known =
        fs::is_regular_file(status) && std::find(kFiles.begin(), kFiles.end(), name) != kFiles.end();
    const bool pictures = fs::is_directory(status) && ((name == "plots" && holds_only(it->path(), ".svg")) ||
                                                       (name == "maps" && holds_only(it->path(), ".fits")));
    const bool session = !pictures && fs::is_directory(status) &&
                         has_own_schema(it->path() / "result.json") && is_own_output(it->path());
    if (!known && !pictures && !session) return false;
    own_below = own_below && (session || name == "summary.csv");
    has_summary = has_summary || name == "summary.csv";
  }
  return !failed && (has_own_schema(folder / "result.json") || (own_below && has_summary));
}

OutputFolder::OutputFolder(fs::path target, fs::path partial)
    : target_(std::move(target)), partial_(std::move(partial)) {}
OutputFolder::OutputFolder(OutputFolder&& other) noexcept
    : target_(std::move(other.target_)), partial_(std::exchange(other.partial_, {})) {}
OutputFolder& OutputFolder::operator=(OutputFolder&& other) noexcept {
  std::swap(target_, other.target_);
  std::swap(partial_, other.partial_);
  return *this;
}
OutputFolder::~OutputFolder() {
  std::error_code ignored;  // a destructor has nobody to tell; what is left is named DIR.partial-PID
  if (!partial_.empty()) fs::remove_all(partial_, ignored);
}

Result<OutputFolder> OutputFolder::begin(const fs::path& folder) {
  if (folder.empty())
    return Error{Errc::output, {{}, {}, {}, "output folder"}, "found an empty name, expected a folder"};
  std::error_code failed;
  fs::path target = fs::weakly_canonical(fs::absolute(folder, failed), failed);
  if (failed)
    return output_error(folder, "found \"" + failed.message() + "\", expected a folder that can be made");
  if (target.filename().empty()) target = target.parent_path();
  if (std::string found = obstacle(target); !found.empty()) return output_error(folder, std::move(found));
  fs::create_directories(target.parent_path(), failed);
  if (failed)
    return output_error(target.parent_path(),
                        "found \"" + failed.message() + "\", expected a folder to write in");

  // A number behind the process id: one process may write several folders, and a crash may have left one
  // behind.
  for (int attempt = 0; attempt < 100; ++attempt) {
    fs::path partial = target;
    partial += ".partial-" + std::to_string(::getpid()) + (attempt == 0 ? "" : "-" + std::to_string(attempt));
    if (::mkdir(partial.c_str(), 0777) == 0) return OutputFolder(std::move(target), std::move(partial));
    if (errno != EEXIST) return system_error(partial, errno, "a folder that can be made");
  }
  return output_error(target, "found 100 unfinished folders beside it, expected room for a new one");
}

Status OutputFolder::commit() {
  if (partial_.empty())
    return output_error(target_, "found the folder already in place, expected one commit");
  if (std::string found = obstacle(target_); !found.empty()) return output_error(target_, std::move(found));
  fs::path old;
  std::error_code failed;
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
  if (!old.empty()) fs::remove_all(old, failed);
  if (failed && !old.empty())
    return output_error(old, "found \"" + failed.message() + "\", expected to remove the old output");
  return Done{};
}

Status write_text_file(const fs::path& file, std::string_view text) {
  const int handle = ::open(file.c_str(), O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0666);
  if (handle < 0) return system_error(file, errno, "a file that can be written");
  int number = 0;
  while (!text.empty() && number == 0) {
    const ssize_t written = ::write(handle, text.data(), std::min<std::size_t>(text.size(), 1U << 30U));
    if (written >= 0)
      text.remove_prefix(static_cast<std::size_t>(written));
    else if (errno != EINTR)
      number = errno;
  }
  if (::close(handle) != 0 && number == 0)
    number = errno;  // network file systems report a full disk only here
  if (number == 0) return Done{};
  std::error_code ignored;
  if (fs::is_regular_file(file, ignored)) fs::remove(file, ignored);
  return system_error(file, number, "a file that can be written");
}

}  // namespace evenfield
