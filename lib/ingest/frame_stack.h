#pragma once
/// The frames of one series, pulled by rows from any number of threads at a time.
///
/// Pixels that lie uncompressed in their files are read by offset. Where frames are compressed in pieces of
/// some rows, each worker decodes the pieces it asks for with decoders of its own. All others are decoded
/// once, whole frames in parallel, into a scratch file without a name in the folder for temporary files, and
/// read from there.

#include <memory>
#include <string>

#include "base/error.h"
#include "base/image.h"

namespace evenfield {

class FrameStack {
 public:
  struct Impl;
  explicit FrameStack(std::shared_ptr<const Impl> impl) : impl_(std::move(impl)) {}

  int frames() const;
  FrameShape shape() const;

  /// 0: any rows can be asked for at the same cost. Else rows come in pieces of so many, from a multiple of
  /// it on; a piece is decoded anew for each call that asks for a part of it.
  int rows_apart() const;

  /// Rows [y, y + rows) of frame `frame` (from 0) at full width, as native pixels of shape().type, into
  /// `pixels`. Error (input) with file and page if the bytes are not there. `worker` counts from 0, below the
  /// threads the stack was opened for; two threads never share one.
  Status read_rows(int frame, int y, int rows, void* pixels, int worker) const;

  /// An error (input) that names file and page of frame `frame`.
  Error error_at(int frame, std::string what) const;

 private:
  std::shared_ptr<const Impl> impl_;
};

}  // namespace evenfield
