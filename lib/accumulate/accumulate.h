#pragma once
/// One pass over the frames of a series: exact sums out.
///
/// Bands of rows are the unit of work. A band is read from each frame of a group, its statistics are finished
/// while it is in cache, and the next group follows; per-pixel sums live as long as their band. Bands are
/// handed out in order and their results added in order, so that every number, floating-point frames
/// included, is the same for any number of threads.

#include <memory>

#include "accumulate/geometry.h"
#include "accumulate/series_statistics.h"
#include "base/error.h"
#include "ingest/frame_stack.h"

namespace evenfield {

inline constexpr int kMostFrames = 16384;  ///< of a series: sums over frames of 16 bit pixels stay below 2^31

struct AccumulateOptions {
  int threads = 1;
  /// A sample that stands out by more than this many standard deviations is set aside as a hit; 0: none is.
  /// The chance of a false hit is below 1e-18 a pixel for normal noise.
  double hit_threshold = 9.0;
  /// Groups of fewer frames are not searched for hits. Two frames cannot tell a blinking pixel from a hit,
  /// which matters where blinking pixels must stay in (darks).
  int fewest_frames_for_hits = 2;
  bool portable_kernels = false;
};

/// What the threads work in. Keep it from one series to the next: making it anew costs as much as measuring a
/// small one. Used by one call at a time.
class AccumulateBuffers {
 public:
  AccumulateBuffers();
  ~AccumulateBuffers();
  AccumulateBuffers(const AccumulateBuffers&) = delete;
  AccumulateBuffers& operator=(const AccumulateBuffers&) = delete;

  struct Impl;
  Impl& impl() { return *impl_; }

 private:
  std::unique_ptr<Impl> impl_;
};

/// Errors (input): rows that cannot be read, a pixel that is not a finite number, more than kMostFrames
/// frames.
Result<SeriesStatistics> accumulate(const FrameStack& frames,
                                    const Geometry& geometry,
                                    const AccumulateOptions& options,
                                    AccumulateBuffers& buffers);
Result<SeriesStatistics> accumulate(const FrameStack& frames,
                                    const Geometry& geometry,
                                    const AccumulateOptions& options);

}  // namespace evenfield
