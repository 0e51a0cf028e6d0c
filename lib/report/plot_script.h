#pragma once
/// Pieces of gnuplot scripts that all pictures share: look, ranges, data blocks, and text that cannot act.
/// Colours: the eight-colour palette for colour-blind readers of M. Okabe and K. Ito (2002); shape tells
/// apart as well.

#include <array>
#include <string>
#include <string_view>
#include <vector>

namespace evenfield {

constexpr std::string_view kBlue = "#0072B2";
constexpr std::string_view kVermilion = "#D55E00";
constexpr std::string_view kGreen = "#009E73";
constexpr std::string_view kGrey = "#666666";
constexpr std::string_view kPaleBlue = "#BCD9EC";  ///< an area behind lines

/// `text` as a gnuplot string: control characters escaped, shortened to 100 bytes, in single quotes, quotes
/// doubled.
std::string gnuplot_text(std::string_view text);

/// A number that gnuplot and SVG can hold: beyond 1e100 in size it counts as that, and below 1e-100 as 0.
double drawable(double value);

/// Extremes of what an axis shows.
class AxisRange {
  double low_ = 0, high_ = 0;
  bool any_ = false;

 public:
  void add(double value);
  bool any() const { return any_; }
  double low() const { return low_; }
  double high() const { return high_; }
  double span() const { return high_ - low_; }
  /// "[low:high]" with a margin; never empty.
  std::string linear() const;
  /// The same for a logarithmic axis; every value added must be above 0.
  std::string logarithmic() const;
};

/// Rows of numbers under a name that plot commands use: "$name << END ...".
class DataBlock {
  std::string rows_;
  std::size_t count_ = 0;

 public:
  void add(std::initializer_list<double> row);
  std::size_t count() const { return count_; }
  std::string define(std::string_view name) const;
};

/// A comma-separated plot command of the parts that have data; "" if none has.
class PlotCommand {
  std::string parts_;

 public:
  void add(const DataBlock& data, std::string_view name, const std::string& how);
  std::string finish() const { return parts_.empty() ? "" : "plot " + parts_ + "\n"; }
};

/// Place of one panel, in shares of the picture from its lower left.
struct PanelPlace {
  double left, right, bottom, top;
};

/// Start of a picture: forgets earlier settings, opens the file, writes the title.
std::string begin_picture(std::string_view file, std::string_view title, int width, int height);
std::string end_picture();

/// Clears what the panel before left and sets place and axis titles.
std::string begin_panel(const PanelPlace& place, std::string_view x_title, std::string_view y_title);

/// Few and round tics on a linear axis ("x" or "y") that shows `span`, five at most, for panels too narrow
/// for gnuplot's own choice. `least`: smallest step.
std::string few_tics(std::string_view axis, double span, double least = 0);

/// Tics of a logarithmic axis that shows `range`: where it holds less than two decades gnuplot's own may have
/// no number at all.
std::string logarithmic_tics(std::string_view axis, const AxisRange& range);

/// A line of text above the left end of the panel.
std::string panel_heading(std::string_view text);

/// The key of this panel as one row of words at the foot of the picture.
std::string key_at_foot();

/// A dashed upright line at x with a word, if any, at `height` (share of the panel) to the left or right of
/// it.
std::string upright_mark(double x, std::string_view word, double height, std::string_view side = "left");

/// Plain upright bars from `columns` "x:low:(0):height". gnuplot's own error bars blank a ring about each
/// marker, which erases the neighbours where points are close.
std::string bars(std::string_view columns, std::string_view colour);

/// Size of a marker that leaves `points` of them apart.
std::string marker_size(std::size_t points);

}  // namespace evenfield
