#pragma once
/// gnuplot scripts of the pictures, one function each; "" where the region has no data for it. `title` is
/// shown at the top and may hold anything, `file` is a plain file name of ours.

#include <string>
#include <string_view>

#include "result/characterization.h"

namespace evenfield {

/// Temporal variance against signal with the fitted line and its range, also on logarithmic axes where the
/// levels span a wide range; below, residuals in units of their standard uncertainty. The curved model is
/// drawn where it leaves the line far enough to be seen.
std::string photon_transfer_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Signal against exposure x light with the line; below, the deviation from it in percent, 5 to 95 % of the
/// range marked.
std::string response_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Light of each flat frame and level of each dark frame against its series, in the order of the session.
std::string frame_means_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Mean of the darks against exposure with the line, from exposure 0 on; beside it the values of the mean
/// dark frame, see value_histogram_panel().
std::string dark_signal_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Signal-to-noise ratio against signal in electrons on logarithmic axes: measured, expected with and without
/// the fixed pattern, and of a detector that adds no noise; a ratio of 1 and saturation are marked.
std::string snr_script(const RegionCurves& curves, std::string_view title, std::string_view file);

}  // namespace evenfield
