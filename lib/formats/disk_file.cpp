#include "formats/disk_file.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <sys/sysmacros.h>
#include <sys/uio.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <fstream>
#include <system_error>
#include <utility>

namespace evenfield {

namespace {

Error system_error(Errc code, const std::filesystem::path& path, const std::string& doing) {
  return Error{code, {path, {}, {}, {}}, doing + ": " + std::generic_category().message(errno)};
}

}  // namespace

Result<DiskFile> DiskFile::open(const std::filesystem::path& path) {
  std::error_code failure;
  const auto status = std::filesystem::status(path, failure);
  const Where where{path, {}, {}, {}};
  if (status.type() == std::filesystem::file_type::not_found) return Error{Errc::input, where, "not found"};
  if (failure) return Error{Errc::input, where, "cannot be read: " + failure.message()};
  if (status.type() == std::filesystem::file_type::directory) {
    return Error{Errc::input, where, "found a folder, expected a file"};
  }
  // Opening a pipe would wait for its writer.
  if (status.type() != std::filesystem::file_type::regular) {
    return Error{Errc::input, where, "found a device or pipe, expected a file"};
  }
  const int descriptor = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
  if (descriptor < 0) return system_error(Errc::input, path, "cannot be opened");
  DiskFile file(descriptor, path, 0);
  struct stat facts {};
  if (::fstat(descriptor, &facts) != 0) return system_error(Errc::input, path, "cannot be read");
  file.size_ = static_cast<std::uint64_t>(facts.st_size);
  return file;
}

Result<DiskFile> DiskFile::temporary() {
  std::error_code failure;
  const std::filesystem::path folder = std::filesystem::temp_directory_path(failure);
  if (failure) {
    return Error{Errc::output, {folder, {}, {}, {}}, "no folder for temporary files: " + failure.message()};
  }
  if (const int nameless = ::open(folder.c_str(), O_TMPFILE | O_RDWR | O_CLOEXEC, 0600); nameless >= 0)
    return DiskFile(nameless, folder, 0);
  // Not every file system has files without a name.
  std::string name = (folder / "evenfield-XXXXXX").string();
  const int descriptor = ::mkostemp(name.data(), O_CLOEXEC);
  if (descriptor < 0) return system_error(Errc::output, folder, "no temporary file can be made here");
  ::unlink(name.c_str());
  return DiskFile(descriptor, folder, 0);
}

DiskFile::DiskFile(DiskFile&& other) noexcept
    : descriptor_(std::exchange(other.descriptor_, -1)), path_(std::move(other.path_)), size_(other.size_) {}

DiskFile& DiskFile::operator=(DiskFile&& other) noexcept {
  if (this != &other) {
    if (descriptor_ >= 0) ::close(descriptor_);
    descriptor_ = std::exchange(other.descriptor_, -1);
    path_ = std::move(other.path_);
    size_ = other.size_;
  }
  return *this;
}

DiskFile::~DiskFile() {
  if (descriptor_ >= 0) ::close(descriptor_);
}

Result<std::size_t> DiskFile::read_some(std::uint64_t offset, void* to, std::size_t bytes) const {
  std::size_t done = 0;
  while (done < bytes) {
    const ssize_t got =
        ::pread(descriptor_, static_cast<char*>(to) + done, bytes - done, static_cast<off_t>(offset + done));
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) return system_error(Errc::input, path_, "cannot be read");
    if (got == 0) break;
    done += static_cast<std::size_t>(got);
  }
  return done;
}

Status DiskFile::read(std::uint64_t offset, void* to, std::size_t bytes) const {
  const auto got = read_some(offset, to, bytes);
  if (!got) return got.error();
  if (*got < bytes) {
    return Error{Errc::input,
                 {path_, {}, {}, {}},
                 "found " + std::to_string(offset + *got) + " bytes, expected at least " +
                     std::to_string(offset + bytes)};
  }
  return Done{};
}

std::optional<std::uint64_t> DiskFile::system_read_ahead() const {
  struct stat facts {};
  if (::fstat(descriptor_, &facts) != 0) return std::nullopt;
  std::ifstream file("/sys/class/bdi/" + std::to_string(major(facts.st_dev)) + ":" +
                     std::to_string(minor(facts.st_dev)) + "/read_ahead_kb");
  std::uint64_t kilobytes = 0;
  if (!(file >> kilobytes)) return std::nullopt;
  return kilobytes * 1024;
}

void DiskFile::will_need(std::uint64_t offset, std::uint64_t bytes) const {
  // Asking for what is in memory already would cost a look at each of its pages.
  char byte = 0;
  iovec one{&byte, 1};
  if (::preadv2(descriptor_, &one, 1, static_cast<off_t>(offset), RWF_NOWAIT) == 1) return;
  // Linux reads no more than one request of the device, 128 kB at least, for each call.
  constexpr std::uint64_t kRequest = std::uint64_t{128} << 10U;
  for (std::uint64_t done = 0; done < bytes; done += kRequest)
    ::posix_fadvise(descriptor_, static_cast<off_t>(offset + done),
                    static_cast<off_t>(std::min(kRequest, bytes - done)), POSIX_FADV_WILLNEED);
}

Status DiskFile::write(std::uint64_t offset, const void* from, std::size_t bytes) {
  std::size_t done = 0;
  while (done < bytes) {
    const ssize_t put = ::pwrite(descriptor_, static_cast<const char*>(from) + done, bytes - done,
                                 static_cast<off_t>(offset + done));
    if (put < 0 && errno == EINTR) continue;
    if (put <= 0) return system_error(Errc::output, path_, "cannot write a temporary file here");
    done += static_cast<std::size_t>(put);
  }
  // Nothing is stored inside the size: several threads may be here.
  if (offset + bytes > size_) size_ = offset + bytes;
  return Done{};
}

Status DiskFile::extend(std::uint64_t bytes) {
  if (bytes <= size_) return Done{};
  if (::ftruncate(descriptor_, static_cast<off_t>(bytes)) != 0) {
    return system_error(Errc::output, path_, "cannot write a temporary file here");
  }
  size_ = bytes;
  return Done{};
}

std::string DiskFile::name_for_library() const { return "/proc/self/fd/" + std::to_string(descriptor_); }

}  // namespace evenfield
