#pragma once
/// Panels that show how often values of a mean frame occur, counts on a logarithmic axis.

#include <string>
#include <string_view>

#include "report/plot_script.h"
#include "result/characterization.h"

namespace evenfield {

/// Where a panel goes and what is written about it. `name` keeps the data of several panels apart.
struct PanelText {
  std::string name;
  PanelPlace place;
  std::string heading;
  bool key = false;  ///< this panel writes the key of the picture
};

/// True if there is anything to draw of `histogram`.
bool has_counts(const Histogram& histogram);

/// Counts of the values [DN] and, over them, what a normal distribution as wide as the white part would give.
std::string value_histogram_panel(const MeanFrame& frame, const PanelText& text);

/// Pixels that lie as far from the mean as x [DN] or farther, and what the normal distribution would give.
std::string deviation_histogram_panel(const MeanFrame& frame, const PanelText& text);

}  // namespace evenfield
