#pragma once
/// How far the work is: written by the stages, read at any time by whoever shows it.

#include <atomic>
#include <cstdint>

namespace evenfield {

struct Progress {
  std::atomic<const char*> stage{"starting"};  ///< "reading frames"; always a literal
  std::atomic<int> series_done{0};
  std::atomic<int> series{0};               ///< 0 as long as it is not known
  std::atomic<std::uint64_t> work_done{0};  ///< in units of `work`
  std::atomic<std::uint64_t> work{0};       ///< bytes, those that have to be decoded weighted; 0: not known
};

}  // namespace evenfield
