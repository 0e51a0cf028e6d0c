#include "report/plots.h"

#include <algorithm>
#include <array>
#include <fstream>
#include <iterator>

#include "report/curve_plots.h"
#include "report/gnuplot.h"
#include "report/output_folder.h"

namespace evenfield {
namespace {

constexpr std::array kTable{
    PlotInfo{"photon_transfer", "Photon transfer",
             "Noise grows with light: the slope of the line is the conversion gain. Points should scatter "
             "evenly about "
             "zero in the lower panel, most of them within two; a bend there means that one line does not "
             "describe "
             "all levels."},
    PlotInfo{"response", "Response",
             "Signal should grow in proportion to the light. The lower panel shows by how many per cent of "
             "the line "
             "each level misses it; the marks bound the range that counts for the linearity error."},
    PlotInfo{
        "frame_means", "Frames over the session",
        "Each point is one frame against the mean of its own series. Slopes show a lamp or an offset that "
        "drifts, single points far out show a failed exposure; small numbers are the indices of the series, "
        "and colour and "
        "marker change where a new one begins."},
};

std::string script_of(std::string_view name,
                      const RegionCurves& curves,
                      std::string_view title,
                      std::string_view file) {
  if (name == "photon_transfer") return photon_transfer_script(curves, title, file);
  if (name == "response") return response_script(curves, title, file);
  return frame_means_script(curves, title, file);
}

/// gnuplot takes one font name only and calls every picture "Gnuplot". Gives the file fonts that exist
/// somewhere and a title; an error if it is not a whole SVG.
Status finish_svg(const std::filesystem::path& file, std::string_view title) {
  std::ifstream stream(file, std::ios::binary);
  std::string svg{std::istreambuf_iterator<char>(stream), {}};
  if (svg.find("</svg>") == std::string::npos)
    return Error{
        Errc::output, {file.filename(), {}, {}, "gnuplot"}, "found no whole picture, expected an SVG file"};
  const auto replace = [&svg](std::string_view from, std::string_view to) {
    for (std::size_t at = 0; (at = svg.find(from, at)) != std::string::npos; at += to.size())
      svg.replace(at, from.size(), to);
  };
  replace("font-family=\"Helvetica\"",
          "font-family=\"Helvetica, Arial, 'Liberation Sans', 'DejaVu Sans', sans-serif\"");
  replace("<title>Gnuplot</title>", "<title>" + std::string(title) + "</title>");
  return write_text_file(file, svg);
}

struct Picture {
  std::string file;
  std::string_view title;
};

}  // namespace

std::span<const PlotInfo> plot_table() { return kTable; }

Result<PlotSelection> plot_selection(const std::vector<std::string>& words) {
  if (words == std::vector<std::string>{"all"}) return PlotSelection{};
  if (words == std::vector<std::string>{"none"}) return PlotSelection{false, {}};
  std::string known = "all, none";
  for (const PlotInfo& info : kTable) known += ", " + std::string(info.name);
  for (const std::string& word : words)
    if (std::none_of(kTable.begin(), kTable.end(), [&](const PlotInfo& info) { return info.name == word; }))
      return Error{Errc::usage, {{}, {}, {}, "--plots"}, "found \"" + word + "\", expected of " + known};
  return PlotSelection{false, words};
}

std::string plot_file(std::string_view name, std::size_t region_index) {
  return std::string(name) + (region_index == 0 ? "" : "_" + std::to_string(region_index + 1)) + ".svg";
}

Result<std::vector<std::string>> draw_plots(const Characterization& result,
                                            const std::filesystem::path& folder,
                                            const PlotSelection& selection) {
  std::vector<Picture> pictures;
  std::string script;
  for (std::size_t region = 0; region < result.curves.size(); ++region) {
    for (const PlotInfo& info : kTable) {
      const bool wanted = selection.all || std::find(selection.names.begin(), selection.names.end(),
                                                     info.name) != selection.names.end();
      if (!wanted) continue;
      const std::string title = std::string(info.title) +
                                (result.curves.size() > 1 ? ", region " + result.curves[region].region : "");
      const std::string file = plot_file(info.name, region);
      const std::string part = script_of(info.name, result.curves[region], title, file);
      if (part.empty()) continue;
      script += part;
      pictures.push_back({file, info.title});
    }
  }
  if (pictures.empty()) return std::vector<std::string>{};
  Status status = run_gnuplot(script, folder);
  std::vector<std::string> files;
  for (const Picture& picture : pictures) {
    if (status) status = finish_svg(folder / picture.file, picture.title);
    files.push_back(picture.file);
  }
  if (status) return files;
  std::error_code ignored;
  for (const std::string& file : files) std::filesystem::remove(folder / file, ignored);
  return status.error();
}

}  // namespace evenfield
