#pragma once
/// What reading a session costs, series by series, and asking the system early for what comes next, so that a
/// cold disk works while frames are decoded and measured. Rows are read in bands from many frames in turn, a
/// pattern that the system's own read-ahead does not recognize.

#include <condition_variable>
#include <cstddef>
#include <cstdint>
#include <mutex>
#include <thread>
#include <vector>

#include "base/progress.h"
#include "formats/frame_file.h"
#include "ingest/session.h"

namespace evenfield {

/// The bytes of the rows of `series` that lie in a region; those of frames that have to be decoded count
/// kDecodingWork times more, about what decoding takes longer than reading.
inline constexpr std::uint64_t kDecodingWork = 12;
std::uint64_t reading_work(const Session& session, const Series& series, const std::vector<FrameFile>& files);

/// Runs ahead of the reader, by at most kBytesAhead, until it is destroyed. What is in memory already costs
/// one system call a megabyte. A file that cannot be opened is passed over: the reader says what is wrong.
class ReadAhead {
 public:
  static constexpr std::uint64_t kBytesAhead = std::uint64_t{256} << 20U;

  /// `order`: the series in the order in which they are read. Where the reader is is taken from `progress`:
  /// so many series of `order` are done, and so much of all reading_work(). All must outlive the object.
  ReadAhead(const Session& session,
            const std::vector<FrameFile>& files,
            std::vector<std::size_t> order,
            const Progress& progress);
  ReadAhead(const ReadAhead&) = delete;
  ReadAhead& operator=(const ReadAhead&) = delete;

 private:
  void run(const std::stop_token& stop);
  /// Waits until byte `place` (of all that is read, in order) is near enough. False: stop.
  bool wait_for_turn(const std::stop_token& stop, std::size_t turn, std::uint64_t place);
  bool ask_for_series(const std::stop_token& stop, std::size_t turn);

  const Session& session_;
  const std::vector<FrameFile>& files_;
  const std::vector<std::size_t> order_;
  const Progress& progress_;
  std::vector<std::uint64_t> work_begin_;  ///< [turn], and the end of the last
  std::vector<std::uint64_t> byte_begin_;  ///< [turn], and the end of the last
  std::mutex guard_;
  std::condition_variable_any wake_;
  std::jthread thread_;  ///< last: it ends before what it uses
};

}  // namespace evenfield
