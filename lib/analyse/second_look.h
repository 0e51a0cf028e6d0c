#pragma once
/// Which series are worth a second look, for what only the mean frame or each pixel by itself shows: the
/// darks behind DSNU, the flat behind PRNU and its darks, and the darks behind read noise where they have
/// frames enough for a noise of each pixel.

#include <cstddef>
#include <vector>

#include "analyse/analysis_input.h"

namespace evenfield {

/// Frames from which on the noise of a single pixel is worth a median.
inline constexpr int kFramesForPixelNoise = 16;

struct SecondLook {
  std::size_t series = 0;
  bool pictures = false;  ///< the mean frame is one of those that are drawn
  bool noise = false;     ///< the temporal noise of each pixel is wanted
};

/// Each series once, in the order of the session.
std::vector<SecondLook> plan_second_look(const AnalysisInput& input);

}  // namespace evenfield
