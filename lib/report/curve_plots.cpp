#include "report/curve_plots.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "base/text.h"
#include "report/plot_script.h"

namespace evenfield {
namespace {

constexpr double kWideRange = 30;  // from here on a linear axis hides the low levels
// The curved model is drawn if somewhere it leaves the line by a pixel or two of the upper panel, or by this
// much in the lower one.
constexpr double kVisibleShare = 0.005, kVisibleResidual = 0.5;

bool finite(const CurvePoint& p) { return std::isfinite(p.x) && std::isfinite(p.y); }

std::vector<CurvePoint> sorted(const std::vector<CurvePoint>& points) {
  std::vector<CurvePoint> out;
  std::copy_if(points.begin(), points.end(), std::back_inserter(out), finite);
  for (CurvePoint& p : out) {
    p.y_uncertainty = std::isfinite(p.y_uncertainty) ? std::abs(p.y_uncertainty) : 0;
    if (p.fitted && !std::isfinite(*p.fitted)) p.fitted.reset();
  }
  std::stable_sort(out.begin(), out.end(), [](const auto& a, const auto& b) { return a.x < b.x; });
  return out;
}

bool is_wide(const std::vector<CurvePoint>& points) {
  double low = 0, high = 0;
  for (const CurvePoint& p : points)
    if (p.x > 0) {
      low = low == 0 ? p.x : std::min(low, p.x);
      high = std::max(high, p.x);
    }
  return low > 0 && high > kWideRange * low;
}

std::string used_style(std::size_t points) {
  return "with points pt 7 ps " + marker_size(points) + " lw 1.2 lc rgb '" + std::string(kBlue) + "'";
}
std::string other_style(std::size_t points) {
  return "with points pt 4 ps " + marker_size(points) + " lw 1.2 lc rgb '" + std::string(kVermilion) + "'";
}

std::string curved_style() { return "using 1:2 with lines lw 2 dt 2 lc rgb '" + std::string(kGreen) + "'"; }

/// Points and line on one pair of axes. `curved` is a second model, `y` its value. `blocks` keeps the names
/// of several panels apart.
std::string curve_panel(const std::vector<CurvePoint>& points,
                        const std::vector<CurvePoint>& curved,
                        const std::string& blocks,
                        bool logarithmic,
                        const std::string& titles) {
  DataBlock used, other, line, curve;
  AxisRange x, y;
  if (!logarithmic) {
    x.add(0);
    y.add(0);
  }
  for (const CurvePoint& p : points) {
    if (logarithmic && (p.x <= 0 || p.y <= 0)) continue;
    // On logarithmic axes a bar that reaches below 0 ends at a tenth of its point.
    const double low = logarithmic ? std::max(p.y - p.y_uncertainty, p.y / 10) : p.y - p.y_uncertainty;
    (p.used ? used : other).add({p.x, p.y, low, p.y + p.y_uncertainty});
    x.add(p.x);
    for (const double value : {p.y, low, p.y + p.y_uncertainty}) y.add(value);
    if (p.fitted && (!logarithmic || *p.fitted > 0)) line.add({p.x, *p.fitted});
  }
  for (const CurvePoint& p : curved)
    if (!logarithmic || (p.x > 0 && p.y > 0)) curve.add({p.x, p.y});
  if (line.count() == 1) line = {};  // one point is no line
  PlotCommand plot;
  plot.add(line, blocks + "_line", "using 1:2 with lines lw 2 lc rgb 'black' title 'fitted model'");
  plot.add(curve, blocks + "_curve", curved_style() + " title 'curved model'");
  plot.add(used, blocks + "_used",
           "using 1:2:3:4 " + used_style(points.size()) + " title 'level in the fit'");
  plot.add(other, blocks + "_other",
           "using 1:2 " + other_style(points.size()) + " title 'level not in the fit'");
  if (!x.any() || plot.finish().empty()) return "";
  return titles + line.define(blocks + "_line") + curve.define(blocks + "_curve") +
         used.define(blocks + "_used") + other.define(blocks + "_other") +
         (logarithmic ? "set logscale xy\nset format '%g'\nset xrange " + x.logarithmic() + "\nset yrange " +
                            y.logarithmic() + "\n"
                      : "set key top left Left reverse\nset xrange " + x.linear() + "\nset yrange " +
                            y.linear() + "\n") +
         plot.finish();
}

struct Deviation {
  double x, value, uncertainty;
  bool used;
};

/// Deviations from the line about 0. The scale is that of the fitted levels; others beyond it are drawn as
/// triangles at the edge, or a saturated level would flatten all others.
std::string deviation_panel(const std::vector<Deviation>& deviations,
                            const std::vector<Deviation>& curved,
                            const std::string& blocks,
                            bool wide,
                            const AxisRange& linear_x,
                            double least_height,
                            const std::string& titles) {
  const bool any_used =
      std::any_of(deviations.begin(), deviations.end(), [](const auto& d) { return d.used; });
  double height = least_height;
  for (const Deviation& d : deviations)
    if (d.used || !any_used) height = std::max(height, std::abs(drawable(d.value)) + drawable(d.uncertainty));
  height *= 1.15;
  DataBlock used, other, beyond, curve;
  AxisRange logarithmic_x;
  for (const Deviation& d : deviations) {
    if (wide && d.x <= 0) continue;
    logarithmic_x.add(d.x);
    if (std::abs(d.value) > height)
      beyond.add({d.x, std::copysign(0.94 * height, d.value)});
    else
      (d.used ? used : other).add({d.x, d.value, d.uncertainty});
  }
  for (const Deviation& d : curved)
    if (!wide || d.x > 0) curve.add({d.x, d.value});
  PlotCommand plot;
  plot.add(curve, blocks + "_curve", curved_style() + " notitle");
  plot.add(used, blocks + "_used", bars("1:($2-$3):(0):(2*$3)", kBlue));
  plot.add(other, blocks + "_other", bars("1:($2-$3):(0):(2*$3)", kVermilion));
  plot.add(used, blocks + "_used", "using 1:2 " + used_style(deviations.size()) + " notitle");
  plot.add(other, blocks + "_other", "using 1:2 " + other_style(deviations.size()) + " notitle");
  plot.add(beyond, blocks + "_beyond",
           "using 1:2 with points pt 8 ps 0.9 lc rgb '" + std::string(kVermilion) + "' title 'off scale'");
  if (plot.finish().empty()) return "";
  const std::string edge = to_text(drawable(height));
  return titles + used.define(blocks + "_used") + other.define(blocks + "_other") +
         beyond.define(blocks + "_beyond") + curve.define(blocks + "_curve") +
         (wide ? "set logscale x\nset format x '%g'\nset xrange " + logarithmic_x.logarithmic() + "\n"
               : "set xrange " + linear_x.linear() + "\n") +
         "set xzeroaxis lt 1 lw 1.2 lc rgb 'black'\nset key at graph 0, graph 1.16 left Left reverse samplen "
         "1\nset "
         "yrange [-" +
         edge + ":" + edge + "]\n" + plot.finish();
}

AxisRange x_from_zero(const std::vector<CurvePoint>& points) {
  AxisRange x;
  x.add(0);
  for (const CurvePoint& p : points) x.add(p.x);
  return x;
}

/// A mark only where the panel shows it.
std::string mark(const std::optional<double>& x,
                 const AxisRange& shown,
                 std::string_view word,
                 double height) {
  if (!x || !std::isfinite(*x) || *x <= 0 || *x > shown.high()) return "";
  return upright_mark(*x, word, height);
}

/// Where the straight line through the fitted values reaches `y`.
std::optional<double> x_of_line(const std::vector<CurvePoint>& points, double y) {
  std::vector<const CurvePoint*> fitted;
  for (const CurvePoint& p : points)
    if (p.fitted) fitted.push_back(&p);
  if (fitted.size() < 2 || fitted.back()->x <= fitted.front()->x) return {};
  const double slope =
      (*fitted.back()->fitted - *fitted.front()->fitted) / (fitted.back()->x - fitted.front()->x);
  if (!(slope > 0)) return {};
  return fitted.front()->x + (y - *fitted.front()->fitted) / slope;
}

/// The curved model at the points of photon_transfer, `fitted` still the line's; empty where the two look
/// alike.
std::vector<CurvePoint> visible_curve(const RegionCurves& curves) {
  if (curves.photon_transfer_curved.size() != curves.photon_transfer.size()) return {};
  std::vector<CurvePoint> curved = curves.photon_transfer;
  for (std::size_t i = 0; i < curved.size(); ++i) curved[i].y = curves.photon_transfer_curved[i];
  curved = sorted(curved);
  // Past the top of the range neither model describes anything.
  if (curves.range_top_dn && std::isfinite(*curves.range_top_dn))
    std::erase_if(curved, [&](const CurvePoint& p) { return p.x > *curves.range_top_dn; });
  if (curved.size() < 2) return {};
  double top = 0;
  for (const CurvePoint& p : curves.photon_transfer)
    if (finite(p)) top = std::max(top, p.y);
  const bool seen = std::any_of(curved.begin(), curved.end(), [&](const CurvePoint& p) {
    if (!p.fitted || !p.used) return false;
    const double gap = std::abs(p.y - *p.fitted);
    return gap > kVisibleShare * top || gap > kVisibleResidual * p.y_uncertainty;
  });
  return seen ? curved : std::vector<CurvePoint>{};
}

/// Distance from the line in units of the uncertainty of each level.
std::vector<Deviation> in_uncertainties(const std::vector<CurvePoint>& points) {
  std::vector<Deviation> out;
  for (const CurvePoint& p : points)
    if (p.fitted && p.y_uncertainty > 0)
      out.push_back({p.x, drawable((p.y - *p.fitted) / p.y_uncertainty), 1, p.used});
  return out;
}

constexpr double kLeft = 0.105, kRight = 0.97;
constexpr PanelPlace kUpper{kLeft, kRight, 0.46, 0.92};
constexpr PanelPlace kUpperLeft{kLeft, 0.51, 0.46, 0.92};
constexpr PanelPlace kUpperRight{0.62, kRight, 0.46, 0.92};
constexpr PanelPlace kLower{kLeft, kRight, 0.12, 0.35};
constexpr int kWidth = 960, kHeight = 700;

}  // namespace

std::string photon_transfer_script(const RegionCurves& curves,
                                   std::string_view title,
                                   std::string_view file) {
  const std::vector<CurvePoint> points = sorted(curves.photon_transfer);
  if (points.empty()) return "";
  const bool wide = is_wide(points);
  const AxisRange x = x_from_zero(points);
  // The upper panel says what the marks are.
  const auto marks = [&](bool named) {
    const char* top = curves.saturates ? "saturation" : "range top";
    return mark(curves.gain_range_dn, x, named ? "end of the gain fit" : "", 0.12) +
           mark(curves.range_top_dn, x, named ? top : "", 0.04);
  };

  const std::vector<CurvePoint> curved = visible_curve(curves);
  constexpr std::string_view kSignal = "signal (DN)", kVariance = "temporal variance less dark (DN²)";
  std::string script = begin_picture(file, title, kWidth, kHeight);
  script += curve_panel(points, curved, "linear", false,
                        begin_panel(wide ? kUpperLeft : kUpper, kSignal, kVariance) + marks(true));
  if (wide)
    script += curve_panel(points, curved, "decades", true, begin_panel(kUpperRight, kSignal, kVariance));
  script += deviation_panel(in_uncertainties(points), in_uncertainties(curved), "residual", wide, x, 3,
                            begin_panel(kLower, kSignal, "residual / uncertainty") + marks(false));
  return script + end_picture();
}

std::string response_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  const std::vector<CurvePoint> points = sorted(curves.response);
  if (points.empty()) return "";
  const AxisRange x = x_from_zero(points);
  std::string marks;
  if (curves.range_top_dn && *curves.range_top_dn > 0) {
    marks += mark(x_of_line(points, 0.05 * *curves.range_top_dn), x, "5 %", 0.93);
    marks += mark(x_of_line(points, 0.95 * *curves.range_top_dn), x, "95 % of the range", 0.93);
  }
  std::vector<Deviation> deviations;
  for (const CurvePoint& p : points)
    if (p.fitted && *p.fitted > 0)
      deviations.push_back({p.x, drawable(100 * (p.y - *p.fitted) / *p.fitted),
                            drawable(100 * p.y_uncertainty / *p.fitted), p.used});

  constexpr std::string_view kLight = "exposure × relative light (s)";
  std::string script = begin_picture(file, title, kWidth, kHeight);
  script += curve_panel(points, {}, "linear", false, begin_panel(kUpper, kLight, "signal (DN)"));
  script += deviation_panel(deviations, {}, "deviation", is_wide(points), x, 1e-3,
                            begin_panel(kLower, kLight, "deviation from line (%)") + marks);
  return script + end_picture();
}

}  // namespace evenfield
