#include "report/histogram_panels.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <numeric>
#include <vector>

#include "base/text.h"

namespace evenfield {
namespace {

constexpr std::size_t kMostBins = 260;  // about one a pixel of the picture
constexpr int kCurvePoints = 120;
constexpr double kFloor = 0.5;  // foot of the count axis: below one pixel there is none

double total(const Histogram& histogram) {
  return static_cast<double>(
      std::accumulate(histogram.counts.begin(), histogram.counts.end(), std::int64_t{0}));
}

/// Width of a bin. Equal values may come as a bin without any.
double width_of(const Histogram& histogram) {
  return histogram.width > 0 ? histogram.width : 1e-3 * std::max(1.0, std::abs(histogram.first));
}

/// Neighbouring bins taken together until no more than kMostBins are left.
Histogram coarser(const Histogram& histogram) {
  const std::size_t together = (histogram.counts.size() + kMostBins - 1) / kMostBins;
  const double width = width_of(histogram);
  Histogram out;
  out.first = histogram.first + 0.5 * width * static_cast<double>(together - 1);
  out.width = width * static_cast<double>(together);
  for (std::size_t i = 0; i < histogram.counts.size(); i += together) {
    const auto begin = histogram.counts.begin() + static_cast<std::ptrdiff_t>(i);
    const auto end = histogram.counts.begin() +
                     static_cast<std::ptrdiff_t>(std::min(i + together, histogram.counts.size()));
    out.counts.push_back(std::accumulate(begin, end, std::int64_t{0}));
  }
  return out;
}

/// Share of a standard normal distribution between `low` and `high`.
double normal_share(double low, double high) {
  return 0.5 * (std::erf(high / std::numbers::sqrt2) - std::erf(low / std::numbers::sqrt2));
}

std::string count_axis(double highest) {
  return "set logscale y\nset ylabel offset 1,0\nset format y '%g'\nset yrange [" + to_text(kFloor) + ":" +
         to_text(3 * std::max(1.0, highest)) + "]\n";
}

std::string normal_style() {
  return "using 1:2 with lines lw 2 dt 2 lc rgb 'black' title 'normal distribution of the white part'";
}

}  // namespace

bool has_counts(const Histogram& histogram) {
  return std::isfinite(histogram.first) && std::isfinite(histogram.width) &&
         std::any_of(histogram.counts.begin(), histogram.counts.end(), [](auto n) { return n > 0; });
}

std::string value_histogram_panel(const MeanFrame& frame, const PanelText& text) {
  if (!has_counts(frame.values)) return "";
  const Histogram bins = coarser(frame.values);
  DataBlock counts, normal;
  AxisRange x;
  double highest = 0;
  for (std::size_t i = 0; i < bins.counts.size(); ++i) {
    const double left = bins.first + (static_cast<double>(i) - 0.5) * bins.width;
    const double count = std::max(kFloor, static_cast<double>(bins.counts[i]));
    highest = std::max(highest, count);
    for (const double edge : {left, left + bins.width}) {
      counts.add({edge, kFloor, count});
      if (bins.counts[i] > 0) x.add(edge);
    }
  }
  const double pixels = total(bins), deviation = frame.normal_dn;
  if (std::isfinite(frame.mean_dn) && std::isfinite(deviation) && deviation > 0) {
    const double reach = 8 * deviation + 0.5 * bins.width;
    for (int i = 0; i <= kCurvePoints; ++i) {
      const double from_mean = reach * (2.0 * i / kCurvePoints - 1);
      const double expected = pixels * normal_share((from_mean - 0.5 * bins.width) / deviation,
                                                    (from_mean + 0.5 * bins.width) / deviation);
      if (expected > kFloor) normal.add({frame.mean_dn + from_mean, expected});
      highest = std::max(highest, expected);
    }
  }
  PlotCommand plot;
  plot.add(
      counts, text.name + "_counts",
      "using 1:2:3 with filledcurves fs solid 1 noborder lc rgb '" + std::string(kBlue) + "' title 'pixels'");
  if (normal.count() > 1) plot.add(normal, text.name + "_normal", normal_style());
  return begin_panel(text.place, "value of the mean frame (DN)",
                     "pixels per " + to_text(drawable(bins.width), 3) + " DN") +
         panel_heading(text.heading) + counts.define(text.name + "_counts") +
         normal.define(text.name + "_normal") + count_axis(highest) + "set xrange " + x.linear() + "\n" +
         few_tics("x", x.span()) + (text.key ? key_at_foot() : "") + plot.finish();
}

std::string deviation_histogram_panel(const MeanFrame& frame, const PanelText& text) {
  const Histogram& far = frame.deviations;
  if (!has_counts(far)) return "";
  const double width = width_of(far);
  const std::size_t step = (far.counts.size() + kMostBins - 1) / kMostBins;
  DataBlock counts, normal;
  AxisRange x;
  x.add(0);
  double highest = 0;
  for (std::size_t i = 0; i < far.counts.size(); ++i) {
    // Of counts that only fall, the last above 0 says how far the farthest pixel is: it is never left out.
    const bool last = i + 1 == far.counts.size() || far.counts[i + 1] <= 0;
    if (i % step != 0 && !(last && far.counts[i] > 0)) continue;
    const double at = far.first + static_cast<double>(i) * width;
    const double count = std::max(kFloor, static_cast<double>(far.counts[i]));
    highest = std::max(highest, count);
    counts.add({at, kFloor, count});
    if (far.counts[i] > 0) x.add(at);
  }
  const double pixels = has_counts(frame.values) ? total(frame.values) : static_cast<double>(far.counts[0]);
  if (std::isfinite(frame.normal_dn) && frame.normal_dn > 0) {
    const double reach = std::min(8 * frame.normal_dn, x.high());
    for (int i = 0; i <= kCurvePoints; ++i) {
      const double at = reach * i / kCurvePoints;
      const double expected = pixels * std::erfc(at / (frame.normal_dn * std::numbers::sqrt2));
      if (expected > kFloor) normal.add({at, expected});
      highest = std::max(highest, expected);
    }
  }
  PlotCommand plot;
  plot.add(
      counts, text.name + "_counts",
      "using 1:2:3 with filledcurves fs solid 1 noborder lc rgb '" + std::string(kBlue) + "' title 'pixels'");
  if (normal.count() > 1) plot.add(normal, text.name + "_normal", normal_style());
  return begin_panel(text.place, "distance from the mean (DN)", "pixels as far or farther") +
         panel_heading(text.heading) + counts.define(text.name + "_counts") +
         normal.define(text.name + "_normal") + count_axis(highest) + "set xrange " + x.linear() + "\n" +
         few_tics("x", x.span()) + (text.key ? key_at_foot() : "") + plot.finish();
}

}  // namespace evenfield
