#pragma once
/// Files by descriptor: read at an offset from any thread, and temporary files without a name. Nothing is
/// mapped, so that a file that shrinks while it is read gives an error and no signal.

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>

#include "base/error.h"

namespace evenfield {

class DiskFile {
 public:
  /// Error (input) if `path` is absent, not a plain file, or may not be read.
  static Result<DiskFile> open(const std::filesystem::path& path);
  /// Empty, without a name, in the folder for temporary files (TMPDIR); gone when closed, however the program
  /// ends. Error (output).
  static Result<DiskFile> temporary();

  DiskFile(DiskFile&& other) noexcept;
  DiskFile& operator=(DiskFile&& other) noexcept;
  DiskFile(const DiskFile&) = delete;
  DiskFile& operator=(const DiskFile&) = delete;
  ~DiskFile();

  std::uint64_t size() const { return size_; }  ///< when it was opened, or as far as it was written
  const std::filesystem::path& path() const { return path_; }  ///< the folder, if temporary

  /// Up to `bytes` bytes from `offset`, fewer only at the end of the file. Error (input) of the system.
  Result<std::size_t> read_some(std::uint64_t offset, void* to, std::size_t bytes) const;
  /// Error (input) if fewer are there: "found N bytes, expected at least M".
  Status read(std::uint64_t offset, void* to, std::size_t bytes) const;
  /// Bytes that the system reads ahead by itself on this file's device; nothing where it does not say so.
  std::optional<std::uint64_t> system_read_ahead() const;
  /// Asks the system to fetch these bytes soon, unless the first of them is in memory. Comes back at once.
  void will_need(std::uint64_t offset, std::uint64_t bytes) const;
  /// From several threads at a time only inside of size(). Error (output).
  Status write(std::uint64_t offset, const void* from, std::size_t bytes);
  /// Makes the file `bytes` long without writing: what was never written reads as zero. Error (output).
  Status extend(std::uint64_t bytes);

  /// A name under which another library can open the same file, even when it has no name of its own.
  std::string name_for_library() const;

 private:
  DiskFile(int descriptor, std::filesystem::path path, std::uint64_t size)
      : descriptor_(descriptor), path_(std::move(path)), size_(size) {}

  int descriptor_ = -1;
  std::filesystem::path path_;
  std::uint64_t size_ = 0;
};

}  // namespace evenfield
