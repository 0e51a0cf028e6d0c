#pragma once
/// The frames of one series, pulled by rows from any number of threads at a time.
///
/// Pixels that lie uncompressed in their files are read by offset. All others are decoded once, whole frames
/// in parallel, into a scratch file without a name in the folder for temporary files, and read from there: a
/// frame compressed in one piece cannot be had by rows, and a strip decoded for each band would be decoded
/// many times.

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

  /// Rows [y, y + rows) of frame `frame` (from 0) at full width, as native pixels of shape().type, into
  /// `pixels`. Error (input) with file and page if the bytes are not there.
  Status read_rows(int frame, int y, int rows, void* pixels) const;

  /// An error (input) that names file and page of frame `frame`.
  Error error_at(int frame, std::string what) const;

 private:
  std::shared_ptr<const Impl> impl_;
};

}  // namespace evenfield
