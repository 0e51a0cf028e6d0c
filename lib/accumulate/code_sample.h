#pragma once
/// Which codes occur: a sample from the first frame of a series.

#include <vector>

#include "accumulate/geometry.h"
#include "base/error.h"
#include "ingest/frame_stack.h"

namespace evenfield {

/// Codes that occur in the middle rows of the first region in the first frame, in about 65 000 pixels:
/// ascending, each once, finite. Error (input) for rows that cannot be read. `worker` as for
/// FrameStack::read_rows.
Status sample_codes(const FrameStack& frames, const Geometry& geometry, int worker, std::vector<double>& out);

}  // namespace evenfield
