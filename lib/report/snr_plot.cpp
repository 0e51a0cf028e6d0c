#include <algorithm>
#include <cmath>
#include <vector>

#include "base/text.h"
#include "report/curve_plots.h"
#include "report/plot_script.h"

namespace evenfield {
namespace {

constexpr int kCurvePoints = 80;

/// Ratio at `signal_e` where noise of this variance adds to that of the light itself.
double ratio_at(double signal_e, double added_variance) {
  return signal_e / std::sqrt(signal_e + added_variance);
}

double square_or_zero(double value) { return std::isfinite(value) ? drawable(value * value) : 0; }

/// Signal at which the ratio is 1: the positive root of s^2 = s + v.
double threshold_of(double added_variance) { return 0.5 + std::sqrt(0.25 + added_variance); }

struct Point {
  double x, y, bar;
};

std::vector<Point> drawn_points(const SnrCurve& snr) {
  std::vector<Point> out;
  for (const SnrPoint& p : snr.points) {
    const double bar = std::isfinite(p.ratio_uncertainty) ? std::abs(p.ratio_uncertainty) : 0;
    const double x = drawable(p.signal_e), y = drawable(p.ratio);
    // Neither zero nor less has a place on logarithmic axes.
    if (std::isfinite(x) && std::isfinite(y) && x > 0 && y > 0) out.push_back({x, y, bar});
  }
  return out;
}

}  // namespace

std::string snr_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  if (!curves.snr) return "";
  const SnrCurve& snr = *curves.snr;
  const std::vector<Point> points = drawn_points(snr);
  if (points.empty()) return "";
  const double temporal = square_or_zero(snr.dark_noise_e);
  const double offsets = square_or_zero(snr.dsnu_e.value_or(0)), gains = square_or_zero(snr.prnu.value_or(0));
  const bool pattern = offsets > 0 || gains > 0;
  const bool saturates = snr.saturation_e && std::isfinite(*snr.saturation_e) && *snr.saturation_e > 0;

  DataBlock measured, saturated;
  AxisRange x, y;
  for (const Point& p : points) {
    // A bar that reaches below 0 ends at a tenth of its point.
    const double low = std::max(p.y - p.bar, p.y / 10);
    x.add(p.x);
    // A saturated level has lost its noise: its ratio means nothing, and it is drawn no higher than light
    // alone could bring it, or it would stretch the axis.
    if (saturates && p.x > *snr.saturation_e) {
      saturated.add({p.x, std::min(p.y, std::sqrt(p.x))});
      continue;
    }
    measured.add({p.x, p.y, low, p.y + p.bar});
    for (const double value : {low, p.y + p.bar}) y.add(value);
  }
  const double threshold = threshold_of(temporal);
  x.add(threshold / 3);
  if (saturates) x.add(*snr.saturation_e);
  y.add(1);
  y.add(ratio_at(x.low(), temporal));

  DataBlock ideal, without_pattern, with_pattern, one;
  const double decades = std::log(x.high() / x.low());
  for (int i = 0; i <= kCurvePoints; ++i) {
    const double signal = x.low() * std::exp(decades * i / kCurvePoints);
    ideal.add({signal, std::sqrt(signal)});
    without_pattern.add({signal, ratio_at(signal, temporal)});
    with_pattern.add({signal, ratio_at(signal, temporal + offsets + gains * signal * signal)});
  }
  y.add(std::sqrt(x.high()));
  one.add({x.low(), 1});
  one.add({x.high(), 1});

  PlotCommand plot;
  const std::string blue(kBlue), green(kGreen), vermilion(kVermilion), grey(kGrey);
  plot.add(ideal, "ideal", "using 1:2 with lines lw 1.4 dt 3 lc rgb '" + grey + "' title 'perfect detector'");
  plot.add(without_pattern, "temporal", "using 1:2 with lines lw 2 lc rgb 'black' title 'expected'");
  if (pattern)
    plot.add(with_pattern, "pattern",
             "using 1:2 with lines lw 2 dt 2 lc rgb '" + green + "' title 'with fixed pattern'");
  plot.add(one, "one", "using 1:2 with lines lw 1.2 dt 2 lc rgb '" + grey + "' notitle");
  plot.add(measured, "measured", bars("1:3:(0):($4-$3)", kBlue));
  plot.add(measured, "measured",
           "using 1:2 with points pt 7 ps " + marker_size(points.size()) + " lc rgb '" + blue +
               "' title 'measured'");

  plot.add(saturated, "saturated",
           "using 1:2 with points pt 4 ps 0.7 lw 1.2 lc rgb '" + vermilion + "' notitle");

  std::string script = begin_picture(file, title, 960, 560);
  script += begin_panel({0.115, 0.97, 0.2, 0.9}, "signal (electrons per pixel)", "signal over noise");
  script += upright_mark(threshold, "signal equals noise", 0.93, "right");
  if (saturates) script += upright_mark(*snr.saturation_e, "saturation", 0.05);
  script += ideal.define("ideal") + without_pattern.define("temporal") +
            (pattern ? with_pattern.define("pattern") : "") + one.define("one") +
            measured.define("measured") + saturated.define("saturated");
  return script + key_at_foot() + "set ylabel offset 1,0\nset logscale xy\nset format '%g'\nset xrange " +
         x.logarithmic() + "\nset yrange " + y.logarithmic() + "\n" + logarithmic_tics("x", x) +
         logarithmic_tics("y", y) + plot.finish() + end_picture();
}

}  // namespace evenfield
