#pragma once
/// An open TIFF file of libtiff, with what the library said about it. libtiff's own habit of printing is off.

#include <cstdint>
#include <filesystem>
#include <memory>
#include <string>
#include <string_view>

#include "base/error.h"

struct tiff;  // libtiff's TIFF

namespace evenfield {

class TiffHandle {
 public:
  /// `mode` as libtiff understands it. No single allocation of the library exceeds `memory_limit` bytes.
  /// Error (`code`) with the library's words.
  static Result<TiffHandle> open(const std::filesystem::path& path,
                                 const char* mode,
                                 std::uint64_t memory_limit,
                                 Errc code);

  tiff* get() const { return tiff_.get(); }

  /// The library's errors since the last call to forget(), the first few, in one line; empty if there were
  /// none.
  const std::string& errors() const { return messages_->errors; }
  const std::string& warnings() const { return messages_->warnings; }
  void forget();

  /// Closes; what the library says while it does stays in errors().
  void close() { tiff_.reset(); }

 private:
  struct Messages {
    std::string errors, warnings;
  };
  struct Close {
    void operator()(tiff* handle) const;
  };
  TiffHandle() : messages_(std::make_unique<Messages>()) {}

  std::unique_ptr<Messages>
      messages_;  // libtiff holds its address; declared first, so that it outlives the handle
  std::unique_ptr<tiff, Close> tiff_;
};

}  // namespace evenfield
