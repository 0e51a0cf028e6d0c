#include "report/spatial_plots.h"

#include <algorithm>
#include <cmath>
#include <functional>
#include <vector>

#include "base/text.h"
#include "report/histogram_panels.h"
#include "report/plot_script.h"

namespace evenfield {
namespace {

constexpr std::size_t kMostSpans = 300;  // a panel is about 400 pixels wide
constexpr std::size_t kFewPoints = 30;   // up to here each point gets a marker: one alone is no line
constexpr double kMostDecades = 6;

/// Neighbouring values that fall on the same place of the picture; extremes are kept, so that no peak is
/// lost.
struct Span {
  double at, low, high;
};

/// `places`: so many the values stand for, as few neighbours as will do made one of each.
std::vector<Span> spans_of(const std::vector<double>& values, int places) {
  const auto size = static_cast<double>(values.size());
  const double neighbours = values.empty() ? 1 : std::max(1.0, std::ceil(places / size));
  const std::size_t together = std::max<std::size_t>(1, (values.size() + kMostSpans - 1) / kMostSpans);
  std::vector<Span> out;
  for (std::size_t begin = 0; begin < values.size(); begin += together) {
    const std::size_t end = std::min(begin + together, values.size());
    const double middle = 0.5 * static_cast<double>(begin + end - 1);
    Span span{middle * neighbours + 0.5 * (neighbours - 1), 0, 0};
    bool any = false;
    for (std::size_t i = begin; i < end; ++i) {
      const double value = drawable(values[i]);
      if (!std::isfinite(value)) continue;
      span.low = any ? std::min(span.low, value) : value;
      span.high = any ? std::max(span.high, value) : value;
      any = true;
    }
    if (any) out.push_back(span);
  }
  return out;
}

double share_of_sorted(std::vector<double> values, double share) {
  const auto at =
      values.begin() + static_cast<std::ptrdiff_t>(share * static_cast<double>(values.size() - 1));
  std::nth_element(values.begin(), at, values.end());
  return *at;
}

std::string marker_if_few(std::size_t points) {
  return points <= kFewPoints ? "linespoints pt 7 ps 0.4" : "lines";
}

std::string plain(double value) { return to_text(drawable(value), 6); }

/// What a profile's axis shows: the mean and the bulk of the middle line, and extremes no farther out than as
/// much again, or one hot pixel would flatten everything.
struct ProfileAxis {
  double low = 0, high = 0;        ///< of the axis
  double lowest = 0, highest = 0;  ///< of the data
  double inside(double value) const { return std::clamp(value, low, high); }
};

ProfileAxis profile_axis(const std::vector<Span>& mean,
                         const std::vector<Span>& middle,
                         const std::vector<Span>& lowest,
                         const std::vector<Span>& highest) {
  AxisRange core, all;
  for (const auto* spans : {&mean, &middle, &lowest, &highest})
    for (const Span& s : *spans) {
      all.add(s.low);
      all.add(s.high);
    }
  for (const Span& s : mean) {
    core.add(s.low);
    core.add(s.high);
  }
  if (!middle.empty()) {
    std::vector<double> low, high;
    for (const Span& s : middle) {
      low.push_back(s.low);
      high.push_back(s.high);
    }
    core.add(share_of_sorted(std::move(low), 0.02));
    core.add(share_of_sorted(std::move(high), 0.98));
  }
  const double beyond = core.high() - core.low();
  if (!(beyond > 0)) return {all.low(), all.high(), all.low(), all.high()};
  return {std::max(all.low(), core.low() - beyond), std::min(all.high(), core.high() + beyond), all.low(),
          all.high()};
}

/// `places`: pixels across the profile.
std::string profile_panel(const Profiles& profiles,
                          int places,
                          const PanelText& text,
                          std::string_view x_title) {
  const std::vector<Span> middle = spans_of(profiles.middle, places), mean = spans_of(profiles.mean, places),
                          lowest = spans_of(profiles.lowest, places),
                          highest = spans_of(profiles.highest, places);
  if (middle.empty() && mean.empty()) return "";
  const ProfileAxis axis = profile_axis(mean, middle, lowest, highest);
  DataBlock band, middle_line, mean_line;
  AxisRange y;
  y.add(axis.low);
  y.add(axis.high);
  if (lowest.size() == highest.size())
    for (std::size_t i = 0; i < lowest.size(); ++i)
      band.add({lowest[i].at, axis.inside(lowest[i].low), axis.inside(highest[i].high)});
  const auto add_line = [&](DataBlock& line, const std::vector<Span>& spans) {
    for (const Span& s : spans) {
      line.add({s.at, axis.inside(s.low)});
      if (s.high > s.low) line.add({s.at, axis.inside(s.high)});
    }
  };
  add_line(middle_line, middle);
  add_line(mean_line, mean);
  const double points =
      std::max(places, static_cast<int>(std::max(profiles.mean.size(), profiles.middle.size())));
  const std::string with = marker_if_few(std::max(mean.size(), middle.size()));
  PlotCommand plot;
  plot.add(band, text.name + "_band",
           "using 1:2:3 with filledcurves fs solid 1 noborder lc rgb '" + std::string(kPaleBlue) +
               "' title 'lowest to highest'");
  plot.add(middle_line, text.name + "_middle",
           "using 1:2 with " + with + " lw 0.8 lc rgb '" + std::string(kBlue) + "' title 'middle line'");
  plot.add(mean_line, text.name + "_mean",
           "using 1:2 with " + with + " lw 1.4 lc rgb 'black' title 'mean of all lines'");
  return begin_panel(text.place, x_title, "mean frame (DN)") +
         panel_heading(text.heading + ": " + plain(axis.lowest) + " to " + plain(axis.highest) + " DN") +
         band.define(text.name + "_band") + middle_line.define(text.name + "_middle") +
         mean_line.define(text.name + "_mean") + "set xrange [-0.5:" + to_text(points - 0.5) + "]\n" +
         few_tics("x", points, 1) + "set ylabel offset 1,0\n" + "set yrange " + y.linear() + "\n" +
         (text.key ? key_at_foot() : "") + plot.finish();
}

std::string spectrogram_panel(const Spectrogram& spectrogram, const PanelText& text) {
  const std::vector<Span> spans = spans_of(spectrogram.amplitude_dn, spectrogram.length / 2 + 1);
  const auto is_level = [](double value) { return std::isfinite(value) && value > 0; };
  double highest = 0;
  for (const Span& s : spans) highest = std::max(highest, s.high);
  if (!(highest > 0) || spectrogram.length < 1) return "";
  const double floor = drawable(highest * std::pow(10, -kMostDecades));
  AxisRange y;
  for (const Span& s : spans)
    for (const double value : {s.low, s.high})
      if (value > floor) y.add(value);
  // Temporal noise that averaging left may lie far below or above: it is shown where it does not squeeze the
  // spectrum.
  DataBlock line, white, temporal;
  const double least = y.low() / 30, most = y.high() * 30;
  const auto add_level = [&](DataBlock& block, double level) {
    if (!is_level(level) || level < least || level > most) return;
    block.add({0, level});
    block.add({0.5, level});
    y.add(level);
  };
  add_level(white, spectrogram.white_dn);
  add_level(temporal, spectrogram.temporal_dn);
  // One key serves all panels: where this one has no white part, a point out of sight stands for it.
  if (text.key && white.count() == 0) white.add({-1, y.high()});
  const double foot = y.low() / 1.2;  // where nothing is left of the pattern the line runs along the foot
  for (const Span& s : spans) {
    const double frequency = s.at / spectrogram.length;
    line.add({frequency, std::max(s.low, foot)});
    if (s.high > s.low) line.add({frequency, std::max(s.high, foot)});
  }
  PlotCommand plot;
  // The pattern lies on its white part where there is none: it goes on top.
  plot.add(white, text.name + "_white", "using 1:2 with lines lw 2 lc rgb 'black' title 'white part'");
  plot.add(temporal, text.name + "_temporal",
           "using 1:2 with lines lw 2 dt 2 lc rgb '" + std::string(kVermilion) +
               "' title 'temporal noise, taken out'");
  plot.add(line, text.name + "_line",
           "using 1:2 with " + marker_if_few(spans.size()) + " lw 0.8 lc rgb '" + std::string(kBlue) +
               "' title 'pattern'");
  const std::string factor =
      is_level(spectrogram.non_whiteness)
          ? ": variance " + to_text(drawable(spectrogram.non_whiteness), 4) + " × white"
          : "";
  return begin_panel(text.place, "cycles per pixel", "amplitude (DN)") +
         panel_heading(text.heading + factor) + line.define(text.name + "_line") +
         white.define(text.name + "_white") + temporal.define(text.name + "_temporal") +
         "set logscale y\nset ylabel offset 1,0\nset format y '%g'\nset xrange [0:0.5]\n" + "set yrange " +
         y.logarithmic() + "\n" + logarithmic_tics("y", y) + (text.key ? key_at_foot() : "") + plot.finish();
}

/// Two panels of one mean frame, left and right. The key is asked for on the last of the picture.
using PanelPair = std::function<std::string(
    const MeanFrame& frame, const std::string& frame_name, const PanelText& left, const PanelText& right)>;

std::string two_by_two(const RegionCurves& curves,
                       std::string_view title,
                       std::string_view file,
                       const PanelPair& draw) {
  struct Row {
    const char* name;
    const std::optional<MeanFrame>* frame;
  };
  std::vector<Row> rows;
  for (const Row& row : {Row{"flat", &curves.flat_frame}, Row{"dark", &curves.dark_frame}})
    if (*row.frame && !draw(**row.frame, row.name, {}, {}).empty()) rows.push_back(row);
  if (rows.empty()) return "";
  constexpr double kLeft = 0.115, kLeftEnd = 0.485, kRight = 0.61, kRightEnd = 0.97;
  const bool two = rows.size() == 2;
  std::string script = begin_picture(file, title, 960, two ? 760 : 440);
  for (std::size_t i = 0; i < rows.size(); ++i) {
    const double bottom = !two ? 0.25 : i == 0 ? 0.595 : 0.16, top = !two ? 0.82 : i == 0 ? 0.89 : 0.455;
    const std::string name = rows[i].name;
    const bool last = i + 1 == rows.size();
    const std::string what = name + " of " + std::to_string((*rows[i].frame)->frames) +
                             ((*rows[i].frame)->frames == 1 ? " frame" : " frames");
    script += draw(**rows[i].frame, what, {name + "_left", {kLeft, kLeftEnd, bottom, top}, "", false},
                   {name + "_right", {kRight, kRightEnd, bottom, top}, "", last});
  }
  return script + end_picture();
}

PanelText with_heading(PanelText text, std::string heading) {
  text.heading = std::move(heading);
  return text;
}

}  // namespace

std::string profiles_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  return two_by_two(curves, title, file,
                    [](const MeanFrame& frame, const std::string& name, const auto& left, const auto& right) {
                      return profile_panel(frame.along_row, frame.of_rows.length, with_heading(left, name),
                                           "column of the region") +
                             profile_panel(frame.along_column, frame.of_columns.length,
                                           with_heading(right, name), "row of the region");
                    });
}

std::string spectrograms_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  return two_by_two(curves, title, file,
                    [](const MeanFrame& frame, const std::string& name, const auto& left, const auto& right) {
                      return spectrogram_panel(frame.of_rows, with_heading(left, name + ", rows")) +
                             spectrogram_panel(frame.of_columns, with_heading(right, name + ", columns"));
                    });
}

std::string histograms_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  return two_by_two(curves, title, file,
                    [](const MeanFrame& frame, const std::string& name, const auto& left, const auto& right) {
                      return value_histogram_panel(frame, with_heading(left, name)) +
                             deviation_histogram_panel(frame, with_heading(right, name + ", how far out"));
                    });
}

}  // namespace evenfield
