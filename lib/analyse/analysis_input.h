#pragma once
/// What the analysis is given: the conditions and summaries of every series, and what the session says of the
/// camera.

#include <optional>
#include <string>
#include <vector>

#include "analyse/series_summary.h"
#include "result/characterization.h"

namespace evenfield {

struct AnalysisInput {
  std::vector<SeriesInput> series;  ///< in the order of the session
  std::vector<Region> regions;
  std::optional<int> bit_depth;  ///< of the converter
  bool floating = false;         ///< pixels are floating-point numbers
  /// Relative standard uncertainty (k = 1) of exposure x light from level to level: repeats in every session.
  double level_relative_uncertainty = 0;
};

}  // namespace evenfield
