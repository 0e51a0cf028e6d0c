#include <cmath>

#include "report/curve_plots.h"
#include "report/plot_script.h"

namespace evenfield {
namespace {

constexpr std::size_t kMostBars = 200;   // more bars would merge into a band that hides the points
constexpr std::size_t kMostLabels = 24;  // more series than these would write their numbers over one another

/// One kind of frame, numbered in the order of the session. Series alternate between two colours and markers.
struct FramePanel {
  DataBlock even, odd;
  AxisRange x, y;
  std::string limits;  // a mark where a new series begins
  std::string labels;
  std::size_t frames = 0, groups = 0;
  int series = -1;

  void add(int in_series, double value, double uncertainty) {
    if (!std::isfinite(value)) return;
    const double at = static_cast<double>(++frames);
    if (in_series != series || groups == 0) {
      series = in_series;
      if (++groups > 1)
        limits += "set arrow from " + std::to_string(frames - 1) + ".5, graph 0 to " +
                  std::to_string(frames - 1) + ".5, graph 1 nohead lw 0.6 lc rgb '#bbbbbb'\n";
      labels += "set label " + gnuplot_text(std::to_string(series)) + " at " + std::to_string(frames) +
                ", graph 0.96 left offset 0,0 font 'Helvetica,10' tc rgb '#666666'\n";
    }
    const double bar = std::isfinite(uncertainty) ? std::abs(uncertainty) : 0;
    (groups % 2 == 1 ? even : odd).add({at, value, bar});
    x.add(at);
    y.add(value - bar);
    y.add(value + bar);
  }

  std::string draw(const std::string& name,
                   const PanelPlace& place,
                   std::string_view x_title,
                   std::string_view y_title) const {
    const std::string size = marker_size(frames);
    AxisRange with_room = y;
    with_room.add(y.high() + 0.1 * (y.high() - y.low()));  // for the numbers of the series
    PlotCommand plot;
    if (frames <= kMostBars) {
      plot.add(even, name + "_even", bars("1:($2-$3):(0):(2*$3)", kBlue));
      plot.add(odd, name + "_odd", bars("1:($2-$3):(0):(2*$3)", kVermilion));
    }
    const std::string look = " ps " + size + " lw 1 lc rgb ";
    plot.add(even, name + "_even",
             "using 1:2 with points pt 7" + look + "'" + std::string(kBlue) + "' notitle");
    plot.add(odd, name + "_odd",
             "using 1:2 with points pt 4" + look + "'" + std::string(kVermilion) + "' notitle");
    return begin_panel(place, x_title, y_title) + even.define(name + "_even") + odd.define(name + "_odd") +
           (groups <= kMostLabels * 8 ? limits : "") + (groups <= kMostLabels ? labels : "") +
           "set xzeroaxis lt 1 lw 1.2 lc rgb 'black'\nset xrange [0.5:" + std::to_string(frames) +
           ".5]\nset yrange " + with_room.linear() + "\n" + plot.finish();
  }
};

}  // namespace

std::string frame_means_script(const RegionCurves& curves, std::string_view title, std::string_view file) {
  FramePanel flats, darks;
  for (const FrameMean& mean : curves.frame_means) {
    if (mean.kind == SeriesKind::flat)
      flats.add(mean.series, 100 * (mean.relative - 1), 100 * mean.deviation_uncertainty);
    else
      darks.add(mean.series, mean.deviation_dn, mean.deviation_uncertainty);
  }
  if (flats.frames == 0 && darks.frames == 0) return "";
  const bool both = flats.frames > 0 && darks.frames > 0;
  constexpr double kLeft = 0.105, kRight = 0.97;
  std::string script = begin_picture(file, title, 960, both ? 700 : 420);
  if (flats.frames > 0)
    script += flats.draw("flats",
                         both ? PanelPlace{kLeft, kRight, 0.6, 0.92} : PanelPlace{kLeft, kRight, 0.19, 0.87},
                         "flat frame, in session order", "light against series (%)");
  if (darks.frames > 0)
    script += darks.draw("darks",
                         both ? PanelPlace{kLeft, kRight, 0.12, 0.44} : PanelPlace{kLeft, kRight, 0.19, 0.87},
                         "dark frame, in session order", "level against series (DN)");
  return script + end_picture();
}

}  // namespace evenfield
