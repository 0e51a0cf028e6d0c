#pragma once
/// The pictures of a result, one SVG file each.

#include <filesystem>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "base/error.h"
#include "result/characterization.h"

namespace evenfield {

struct PlotInfo {
  std::string_view name;  ///< stem of the file, and the word that selects it
  std::string_view title;
  std::string_view sentence;  ///< how to read it
};

/// Every picture this version draws, in the order of the report.
std::span<const PlotInfo> plot_table();

/// Which pictures to draw: all, none, or those named (of plot_table()).
struct PlotSelection {
  bool all = true;
  std::vector<std::string> names;  ///< used unless `all`; empty: none
};

/// From the words of the command line: "all", "none" or names. Error `usage` for a word that is none of them.
Result<PlotSelection> plot_selection(const std::vector<std::string>& words);

/// File name of a picture: "response.svg" for the first region, "response_2.svg" for the second.
std::string plot_file(std::string_view name, std::size_t region_index);

/// Draws into `folder`, which must exist, and returns the names of the files made, region by region. A region
/// without data for a picture has no file. Error `output` if gnuplot is missing or fails; nothing is left
/// behind then.
Result<std::vector<std::string>> draw_plots(const Characterization& result,
                                            const std::filesystem::path& folder,
                                            const PlotSelection& selection);

}  // namespace evenfield
