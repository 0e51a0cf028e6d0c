#pragma once
/// gnuplot scripts of what only mean frames show: the flat above, the dark below it; "" where the region has
/// neither. Arguments as in curve_plots.h.

#include <string>
#include <string_view>

#include "result/characterization.h"

namespace evenfield {

/// Lines across the frame, along its rows and along its columns: middle line, mean of all lines, and the band
/// from the lowest to the highest value. What would flatten the rest ends at the edge; the heading says how
/// far it goes.
std::string profiles_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// Amplitude of the pattern against spatial frequency, of the rows and of the columns.
std::string spectrograms_script(const RegionCurves& curves, std::string_view title, std::string_view file);

/// How often values occur, and how many pixels lie farther out than a given distance.
std::string histograms_script(const RegionCurves& curves, std::string_view title, std::string_view file);

}  // namespace evenfield
