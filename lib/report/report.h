#pragma once
/// The last stage: what was found, as files for programs and for people.

#include <filesystem>
#include <string>
#include <vector>

#include "base/error.h"
#include "report/plots.h"
#include "result/characterization.h"

namespace evenfield {

struct ReportOptions {
  PlotSelection plots;
};

struct ReportOutcome {
  std::vector<std::filesystem::path> files;  ///< written, relative to the folder
  std::string message;  ///< why there are no pictures although some were asked for, or ""
};

/// Writes result.json, quantities.csv, series.csv, findings.csv, plots/*.svg and report.html into `folder`,
/// which must exist (see OutputFolder). Without gnuplot everything else is written and `message` says so.
/// Error `output` if a file cannot be written or a number of the result is not finite.
Result<ReportOutcome> write_report(const Characterization& result,
                                   const std::filesystem::path& folder,
                                   const ReportOptions& options);

}  // namespace evenfield
