#include "base/parallel.h"

#include <algorithm>
#include <atomic>
#include <mutex>
#include <optional>
#include <thread>
#include <vector>

#include "base/interrupt.h"

namespace evenfield {

int hardware_threads() { return std::max(1, static_cast<int>(std::thread::hardware_concurrency())); }

Status for_each_item(int items, int threads, const std::function<Status(int, int)>& work) {
  const int workers = std::clamp(threads, 1, std::max(1, items));
  std::atomic<int> next{0};
  std::atomic<bool> failed{false};
  std::mutex guard;
  std::optional<std::pair<int, Error>> first;
  const auto run = [&](int worker) {
    // Items are handed out in order, so every item below a failed one has started and may still report.
    for (int item = next++; item < items && !failed; item = next++) {
      const Status status = interrupt_requested() ? Status(interrupted()) : work(item, worker);
      if (status) continue;
      const std::lock_guard lock(guard);
      if (!first || item < first->first) first.emplace(item, status.error());
      failed = true;
    }
  };
  {
    std::vector<std::jthread> pool;
    for (int worker = 1; worker < workers; ++worker) pool.emplace_back(run, worker);
    run(0);
  }
  if (first) return first->second;
  return Done{};
}

}  // namespace evenfield
