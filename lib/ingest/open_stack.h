#pragma once
/// From the frames of a series, as its session names them, to rows of pixels.

#include <vector>

#include "base/error.h"
#include "formats/frame_file.h"
#include "ingest/frame_stack.h"
#include "ingest/session.h"

namespace evenfield {

/// `files` are those of the session, index-aligned with Session::files. Frames that have to be decoded are decoded here,
/// on `threads` threads. Errors: input for files that do not decode; output when there is no room for the scratch
/// file (it takes the size of the decoded frames of this one series).
Result<FrameStack> open_stack(const Session& session, const Series& series, const std::vector<FrameFile>& files, int threads);

}  // namespace evenfield
