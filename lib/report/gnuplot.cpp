#include "report/gnuplot.h"

#include <fcntl.h>
#include <spawn.h>
#include <sys/mman.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <chrono>
#include <csignal>
#include <cstdlib>
#include <string_view>
#include <system_error>
#include <thread>

namespace evenfield {
namespace {

constexpr std::chrono::minutes kLongest{2};

Error gnuplot_error(const std::string& found) {
  return {
      Errc::output, {{}, {}, {}, "gnuplot"}, "found " + found + ", expected a program that draws the plots"};
}

/// A file in memory. As input it needs no thread that feeds a pipe, as error output none that drains it.
class MemoryFile {
  int handle_;

 public:
  explicit MemoryFile(const char* name) : handle_(::memfd_create(name, MFD_CLOEXEC)) {}
  ~MemoryFile() {
    if (handle_ >= 0) ::close(handle_);
  }
  MemoryFile(const MemoryFile&) = delete;
  MemoryFile& operator=(const MemoryFile&) = delete;
  int handle() const { return handle_; }

  bool fill(std::string_view text) const {
    while (!text.empty()) {
      const ssize_t written = ::write(handle_, text.data(), text.size());
      if (written < 0 && errno == EINTR) continue;
      if (written <= 0) return false;
      text.remove_prefix(static_cast<std::size_t>(written));
    }
    return ::lseek(handle_, 0, SEEK_SET) == 0;
  }
  std::string start() const {
    std::array<char, 4096> bytes{};
    const ssize_t count = ::pread(handle_, bytes.data(), bytes.size(), 0);
    return {bytes.data(), count > 0 ? static_cast<std::size_t>(count) : 0};
  }
};

/// gnuplot points at the error in a picture of several lines; the last one that says something is the
/// message.
std::string message_of(const std::string& output) {
  std::string last;
  for (std::size_t begin = 0; begin < output.size();) {
    const std::size_t end = std::min(output.find('\n', begin), output.size());
    const std::string line = output.substr(begin, end - begin);
    const std::size_t told = std::min(line.find_first_not_of(' '), line.size());
    if (line.compare(told, 5, "line ") == 0) return line.substr(told);
    if (line.find_first_not_of(" ^\t\r") != std::string::npos)
      last = line.substr(line.find_first_not_of(' '));
    begin = end + 1;
  }
  return last;
}

/// Exit status, or nothing if the process had to be ended because it took too long.
bool wait_for(pid_t process, int& status) {
  const auto deadline = std::chrono::steady_clock::now() + kLongest;
  for (;;) {
    const pid_t ended = ::waitpid(process, &status, WNOHANG);
    if (ended == process) return true;
    if (ended < 0 && errno != EINTR) return false;
    if (std::chrono::steady_clock::now() > deadline) {
      ::kill(process, SIGKILL);
      while (::waitpid(process, &status, 0) < 0 && errno == EINTR) {
      }
      return false;
    }
    std::this_thread::sleep_for(std::chrono::milliseconds(2));
  }
}

}  // namespace

Status run_gnuplot(const std::string& script, const std::filesystem::path& folder) {
  const MemoryFile input("gnuplot script"), errors("gnuplot messages");
  if (input.handle() < 0 || errors.handle() < 0 || !input.fill(script))
    return gnuplot_error("no memory for its script");

  // A small environment of our own: nothing of the user's changes a picture, and numbers keep their points.
  const char* search_path = std::getenv("PATH");
  std::string path =
      std::string("PATH=") + (search_path != nullptr ? search_path : "/usr/local/bin:/usr/bin:/bin");
  std::string locale = "LC_ALL=C.UTF-8", home = "HOME=/nonexistent";
  std::array<char*, 4> environment{path.data(), locale.data(), home.data(), nullptr};
  std::string program = "gnuplot", no_start_up = "-d";
  std::array<char*, 3> arguments{program.data(), no_start_up.data(), nullptr};

  posix_spawn_file_actions_t actions;
  if (::posix_spawn_file_actions_init(&actions) != 0) return gnuplot_error("no memory to start it");
  ::posix_spawn_file_actions_adddup2(&actions, input.handle(), STDIN_FILENO);
  ::posix_spawn_file_actions_addopen(&actions, STDOUT_FILENO, "/dev/null", O_WRONLY, 0);
  ::posix_spawn_file_actions_adddup2(&actions, errors.handle(), STDERR_FILENO);
  ::posix_spawn_file_actions_addchdir_np(&actions, folder.c_str());
  pid_t process = 0;
  const int failed =
      ::posix_spawnp(&process, "gnuplot", &actions, nullptr, arguments.data(), environment.data());
  ::posix_spawn_file_actions_destroy(&actions);
  if (failed == ENOENT) return gnuplot_error("none installed");
  if (failed != 0) return gnuplot_error("\"" + std::generic_category().message(failed) + "\"");

  int status = 0;
  if (!wait_for(process, status)) return gnuplot_error("no end after two minutes");
  if (WIFEXITED(status) && WEXITSTATUS(status) == 0) return Done{};
  const std::string message = message_of(errors.start());
  return gnuplot_error(message.empty() ? "it ended without a message" : "\"" + message + "\"");
}

}  // namespace evenfield
