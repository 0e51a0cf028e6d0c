#pragma once
/// From the frames of a series, as its session names them, to rows of pixels.

#include <atomic>
#include <mutex>
#include <vector>

#include "base/error.h"
#include "base/progress.h"
#include "formats/disk_file.h"
#include "formats/frame_file.h"
#include "ingest/frame_stack.h"
#include "ingest/session.h"

namespace evenfield {

/// Scratch files for decoded frames that the stacks of a session take and give back one after the other: a
/// file that was written before costs a third of a new one. From any thread; must outlive the stacks.
class ScratchFiles {
 public:
  Result<DiskFile> take();
  void give_back(DiskFile file);

 private:
  std::mutex guard_;
  std::vector<DiskFile> spare_;
};

/// What the stacks of one session share; each may be left out, and must outlive the stacks.
struct StackSharing {
  Progress* progress =
      nullptr;  ///< its work done grows by reading_work() from the stack's beginning to its end
  ScratchFiles* scratch = nullptr;
  const std::atomic<bool>* give_up = nullptr;  ///< once true, decoding ends with Errc::interrupted
};

/// `files` are those of the session, index-aligned with Session::files; they must outlive the stack. Frames
/// that have to be decoded as a whole are decoded here, on `threads` threads. Errors: input for files that do
/// not decode; output when there is no room for the scratch file (it takes the size of the decoded frames of
/// this one series).
Result<FrameStack> open_stack(const Session& session,
                              const Series& series,
                              const std::vector<FrameFile>& files,
                              int threads,
                              StackSharing sharing = {});

}  // namespace evenfield
