#include "progress_watch.h"

#include <algorithm>
#include <cmath>
#include <optional>
#include <string>

namespace evenfield {
namespace {

using Clock = std::chrono::steady_clock;

constexpr std::chrono::milliseconds kRedraw{200};
/// Before that, a guess would jump.
constexpr std::chrono::seconds kFirstGuess{2};

std::string duration_text(double seconds) {
  const auto whole = static_cast<long>(std::ceil(seconds));
  if (whole < 90) return std::to_string(whole) + " s";
  const long minutes = (whole + 30) / 60;
  return minutes < 90 ? std::to_string(minutes) + " min"
                      : std::to_string(minutes / 60) + " h " + std::to_string(minutes % 60) + " min";
}

}  // namespace

ProgressWatch::ProgressWatch(ProgressLine& line, const Progress& progress)
    : line_(line), progress_(progress) {
  if (line.shown()) thread_ = std::jthread([this](const std::stop_token& stop) { run(stop); });
}

void ProgressWatch::run(const std::stop_token& stop) {
  std::optional<Clock::time_point> begin;  // of the work that is counted
  std::string last;
  do {  // once at least, however quick the work is
    std::string text = progress_.stage.load();
    const int series = progress_.series.load();
    const auto work = static_cast<double>(progress_.work.load());
    const double part =
        work > 0 ? std::min(1.0, static_cast<double>(progress_.work_done.load()) / work) : 0.0;
    if (series > 0)
      text +=
          ": " + std::to_string(progress_.series_done.load()) + " of " + std::to_string(series) + " series";
    if (part > 0 && part < 1) {
      if (!begin) begin = Clock::now();
      const std::chrono::duration<double> took = Clock::now() - *begin;
      text += ", " + std::to_string(static_cast<int>(100 * part)) + " %";
      // The mean speed since the beginning: steadier than any recent one, and series are much alike.
      if (took >= kFirstGuess) text += ", about " + duration_text(took.count() * (1 - part) / part) + " left";
    }
    if (text != last && !text.empty()) line_.show(text);
    last = text;
    std::unique_lock lock(guard_);
    wake_.wait_for(lock, stop, kRedraw, [] { return false; });
  } while (!stop.stop_requested());
}

}  // namespace evenfield
