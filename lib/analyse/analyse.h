#pragma once
/// From summaries of all series to numbers: fits, intervals, findings. Calls the methods in order and
/// computes nothing itself.

#include "analyse/analysis_input.h"
#include "result/characterization.h"

namespace evenfield {

/// Fills regions, quantities, correlations, series, findings and curves; the rest of the value is the
/// caller's. `rows` of Characterization::series are series by series, region by region.
Characterization analyse(const AnalysisInput& input);

}  // namespace evenfield
