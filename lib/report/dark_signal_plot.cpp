#include <algorithm>
#include <cmath>
#include <vector>

#include "report/curve_plots.h"
#include "report/histogram_panels.h"
#include "report/plot_script.h"

namespace evenfield {
namespace {

std::vector<CurvePoint> drawn_points(const std::vector<CurvePoint>& points) {
  std::vector<CurvePoint> out;
  for (const CurvePoint& p : points)
    if (std::isfinite(p.x) && std::isfinite(p.y)) out.push_back(p);
  std::stable_sort(out.begin(), out.end(), [](const auto& a, const auto& b) { return a.x < b.x; });
  return out;
}

/// The line as it was fitted, led back to exposure 0, where the offset is read.
DataBlock line_from_zero(const std::vector<CurvePoint>& points, AxisRange& y) {
  std::vector<const CurvePoint*> fitted;
  for (const CurvePoint& p : points)
    if (p.fitted && std::isfinite(*p.fitted)) fitted.push_back(&p);
  DataBlock line;
  if (fitted.size() < 2 || fitted.back()->x <= fitted.front()->x) return line;
  const CurvePoint &first = *fitted.front(), &last = *fitted.back();
  const double slope = (*last.fitted - *first.fitted) / (last.x - first.x);
  for (const double x : {0.0, last.x}) {
    const double at = *first.fitted + slope * (x - first.x);
    line.add({x, at});
    y.add(at);
  }
  return line;
}

std::string exposure_panel(const std::vector<CurvePoint>& points, const PanelPlace& place) {
  DataBlock used, other;
  AxisRange x, y;
  x.add(0);
  for (const CurvePoint& p : points) {
    const double bar = std::isfinite(p.y_uncertainty) ? std::abs(p.y_uncertainty) : 0;
    (p.used ? used : other).add({p.x, p.y, bar});
    x.add(p.x);
    y.add(p.y - bar);
    y.add(p.y + bar);
  }
  const DataBlock line = line_from_zero(points, y);
  const std::string size = marker_size(points.size()), blue(kBlue), vermilion(kVermilion);
  PlotCommand plot;
  plot.add(line, "dark_line", "using 1:2 with lines lw 2 lc rgb 'black' title 'fitted line'");
  plot.add(used, "dark_used", bars("1:($2-$3):(0):(2*$3)", kBlue));
  plot.add(other, "dark_other", bars("1:($2-$3):(0):(2*$3)", kVermilion));
  plot.add(
      used, "dark_used",
      "using 1:2 with points pt 7 ps " + size + " lw 1.2 lc rgb '" + blue + "' title 'darks in the fit'");
  plot.add(
      other, "dark_other",
      "using 1:2 with points pt 4 ps " + size + " lw 1.2 lc rgb '" + vermilion + "' title 'other darks'");
  return begin_panel(place, "exposure (s)", "mean of the darks (DN)") + line.define("dark_line") +
         used.define("dark_used") + other.define("dark_other") +
         "set key top left Left reverse\nset xrange " + x.linear() + "\n" + few_tics("x", x.span()) +
         "set yrange " + y.linear() + "\n" + plot.finish();
}

}  // namespace

std::string dark_signal_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  const std::vector<CurvePoint> points = drawn_points(curves.dark_mean);
  const bool spread = curves.dark_frame && has_counts(curves.dark_frame->values);
  if (points.empty() && !spread) return "";
  constexpr double kLeft = 0.115, kRight = 0.97, kBottom = 0.25, kTop = 0.82;
  const bool both = spread && !points.empty();
  std::string script = begin_picture(file, title, 960, 440);
  if (!points.empty()) script += exposure_panel(points, {kLeft, both ? 0.485 : kRight, kBottom, kTop});
  if (spread)
    script += value_histogram_panel(*curves.dark_frame,
                                    {"dark_values",
                                     {both ? 0.61 : kLeft, kRight, kBottom, kTop},
                                     "dark of " + std::to_string(curves.dark_frame->frames) + " frames",
                                     true});
  return script + end_picture();
}

}  // namespace evenfield
