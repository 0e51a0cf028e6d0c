#pragma once
/// Keeps the progress line of a terminal up to date while the work goes on elsewhere:
///   reading frames: 12 of 52 series, 23 %, about 14 s left

#include <chrono>
#include <condition_variable>
#include <mutex>
#include <thread>

#include "base/progress.h"
#include "commands.h"

namespace evenfield {

/// Until it is destroyed. Starts no thread if the line is not shown.
class ProgressWatch {
 public:
  ProgressWatch(ProgressLine& line, const Progress& progress);
  ProgressWatch(const ProgressWatch&) = delete;
  ProgressWatch& operator=(const ProgressWatch&) = delete;

 private:
  void run(const std::stop_token& stop);

  ProgressLine& line_;
  const Progress& progress_;
  std::mutex guard_;
  std::condition_variable_any wake_;
  std::jthread thread_;  ///< last: it ends before what it uses
};

}  // namespace evenfield
