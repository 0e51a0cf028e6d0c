#pragma once
/// The user's wish to stop, seen by all long loops between two pieces of work.

#include <atomic>

#include "base/error.h"

namespace evenfield {

/// Set by the program's signal handler; never cleared.
inline std::atomic<bool>& interrupt_requested() {
  static std::atomic<bool> requested{false};
  return requested;
}

inline Error interrupted() { return {Errc::interrupted, {}, "interrupted"}; }

}  // namespace evenfield
