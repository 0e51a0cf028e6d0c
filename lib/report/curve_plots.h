#pragma once
/// gnuplot scripts of the pictures, one function each; "" where the region has no data for it. `title` is
/// shown at the top and may hold anything, `file` is a plain file name of ours.

#include <string>
#include <string_view>

#include "result/characterization.h"

namespace evenfield {

/// Temporal variance against signal with the fitted line and its range, also on logarithmic axes where the
/// levels span a wide range; below, residuals in units of their standard uncertainty.
std::string photon_transfer_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Signal against exposure x light with the line; below, the deviation from it in percent, 5 to 95 % of the
/// range marked.
std::string response_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Light of each flat frame and level of each dark frame against its series, in the order of the session.
std::string frame_means_script(const RegionCurves& curves, std::string_view title, std::string_view file);

}  // namespace evenfield
