#pragma once
/// Memory for pixels and sums that are written before they are read.

#include <cstddef>
#include <memory>
#include <new>

namespace evenfield {

/// Memory that is not filled with zeros before use, at the begin of a line of the cache.
class RawMemory {
 public:
  /// At least so many bytes; what was there is lost if there were fewer.
  std::byte* room_for(std::size_t bytes) {
    if (bytes > bytes_) {
      memory_.reset();
      memory_.reset(static_cast<std::byte*>(::operator new(bytes, kLine)));
      bytes_ = bytes;
    }
    return memory_.get();
  }

 private:
  static constexpr std::align_val_t kLine{64};
  struct Free {
    void operator()(std::byte* p) const { ::operator delete(p, kLine); }
  };
  std::unique_ptr<std::byte, Free> memory_;
  std::size_t bytes_ = 0;
};

}  // namespace evenfield
