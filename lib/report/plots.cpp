#include "report/plots.h"

#include <algorithm>
#include <array>
#include <fstream>
#include <iterator>

#include "report/curve_plots.h"
#include "report/gnuplot.h"
#include "report/output_folder.h"
#include "report/spatial_plots.h"

namespace evenfield {
namespace {

// In the order of the questions people ask of a camera.
constexpr std::array kTable{
    PlotInfo{
        "photon_transfer", "Can the gain be trusted? Photon transfer",
        "Noise grows with light: the slope of the line is the conversion gain. Points should scatter "
        "evenly about zero in the lower panel, most of them within two; a bend there means that one line "
        "does not describe all levels. A dashed curve, where there is one, is the model that allows for "
        "such a bend."},
    PlotInfo{"response", "Where is it linear? Response to light",
             "Signal should grow in proportion to the light. The lower panel shows by how many per cent of "
             "the line each level misses it; the marks bound the range that counts for the linearity error."},
    PlotInfo{
        "frame_means", "Was the light steady? Frames over the session",
        "Each point is one frame against the mean of its own series. Slopes show a lamp or an offset that "
        "drifts, single points far out show a failed exposure; small numbers are the indices of the "
        "series, and colour and marker change where a new one begins."},
    PlotInfo{
        "dark_signal", "How dark is dark? Offset and dark signal",
        "The line meets the left edge at the offset of the camera and climbs by the dark current; noise "
        "alone would fill the histogram up to the dashed curve. Pixels outside the curve are hot, cold, or "
        "part of a pattern."},
    PlotInfo{
        "profiles", "What is uneven? Lines across the mean frames",
        "Mean frame, so that little noise is left. A slow bend of the black line is light that falls off, "
        "a jump is a seam between amplifiers, a spike of it is a bad row or column. Single pixels show in "
        "the band only; what lies beyond the edge is cut, and the heading gives the extremes."},
    PlotInfo{
        "spectrograms", "Does it repeat? Spectra of the mean frames",
        "A peak is a pattern that repeats: one at 0.5 cycles per pixel alternates from line to line, a rise "
        "towards 0 is smooth unevenness. Without a pattern the curve lies along its white part. The heading "
        "compares the whole variance with that part: 1 means no pattern at all."},
    PlotInfo{
        "histograms", "How many pixels stand out? Values of the mean frames",
        "Left, how often values occur; right, how many pixels lie at least so far from the mean, from which "
        "a limit for defects can be read. Beyond the dashed curve pixels are more than unlucky. An unevenly "
        "lit flat is wider than it."},
    PlotInfo{
        "snr", "What can be seen? Signal over noise",
        "Where the black line reaches the level 1 the signal equals its noise: less is hard to tell from "
        "darkness. Black is what light and temporal noise of the dark let expect, the dotted line what a "
        "detector without noise of its own would reach: the root of the signal. The green curve counts the "
        "fixed pattern as noise; without correction of it no more can be seen. "
        "Squares lie past saturation, where levels lose their noise and the ratio its meaning."},
};

using Script = std::string (*)(const RegionCurves& curves, std::string_view title, std::string_view file);
constexpr std::array<Script, kTable.size()> kScripts{
    photon_transfer_script, response_script,     frame_means_script, dark_signal_script,
    profiles_script,        spectrograms_script, histograms_script,  snr_script};

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
    for (std::size_t plot = 0; plot < kTable.size(); ++plot) {
      const PlotInfo& info = kTable[plot];
      const bool wanted = selection.all || std::find(selection.names.begin(), selection.names.end(),
                                                     info.name) != selection.names.end();
      if (!wanted) continue;
      const std::string title = std::string(info.title) +
                                (result.curves.size() > 1 ? ", region " + result.curves[region].region : "");
      const std::string file = plot_file(info.name, region);
      const std::string part = kScripts[plot](result.curves[region], title, file);
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
