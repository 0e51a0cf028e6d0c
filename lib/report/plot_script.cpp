#include "report/plot_script.h"

#include <algorithm>
#include <cmath>
#include <initializer_list>

#include "base/text.h"

namespace evenfield {
namespace {

constexpr double kLargest = 1e100;
constexpr std::size_t kLongestText = 100;

}  // namespace

std::string gnuplot_text(std::string_view text) {
  std::string safe = escape_control(text);
  if (safe.size() > kLongestText) {
    std::size_t end = kLongestText;
    while (end > 0 && (static_cast<unsigned char>(safe[end]) & 0xC0U) == 0x80U) --end;
    safe = safe.substr(0, end) + "...";
  }
  std::string out = "'";
  for (const char c : safe) {
    if (c == '\'') out += '\'';
    out += c;
  }
  return out + "'";
}

double drawable(double value) {
  if (std::abs(value) < 1 / kLargest) return 0;
  return std::clamp(value, -kLargest, kLargest);
}

void AxisRange::add(double value) {
  value = drawable(value);
  low_ = any_ ? std::min(low_, value) : value;
  high_ = any_ ? std::max(high_, value) : value;
  any_ = true;
}

std::string AxisRange::linear() const {
  const double size = std::max({high_ - low_, 1e-9 * std::max(std::abs(low_), std::abs(high_)), 1e-90});
  const double margin = high_ > low_ ? 0.06 * size : std::max(0.5 * std::abs(high_), high_ == 0 ? 1.0 : size);
  // An axis that starts at 0 stays there: signals and exposures have no negative side.
  const double low = low_ == 0 && high_ > 0 ? 0 : low_ - margin;
  return "[" + to_text(low) + ":" + to_text(high_ + margin) + "]";
}

std::string AxisRange::logarithmic() const {
  const double margin = std::max(std::pow(high_ / low_, 0.06), 1.2);
  return "[" + to_text(low_ / margin) + ":" + to_text(high_ * margin) + "]";
}

void DataBlock::add(std::initializer_list<double> row) {
  for (const double value : row) rows_ += to_text(drawable(value)) + " ";
  rows_.back() = '\n';
  ++count_;
}

std::string DataBlock::define(std::string_view name) const {
  return "$" + std::string(name) + " << END_OF_DATA\n" + rows_ + "END_OF_DATA\n";
}

void PlotCommand::add(const DataBlock& data, std::string_view name, const std::string& how) {
  if (data.count() == 0) return;  // an empty block is an error to gnuplot
  if (!parts_.empty()) parts_ += ", ";
  parts_ += "$" + std::string(name) + " " + how;
}

std::string begin_picture(std::string_view file, std::string_view title, int width, int height) {
  const std::string size = std::to_string(width) + "," + std::to_string(height);
  return "reset\nset encoding utf8\nset terminal svg size " + size +
         " dynamic noenhanced font 'Helvetica,14' background rgb 'white'\nset output " + gnuplot_text(file) +
         "\nset multiplot title " + gnuplot_text(title) + " font 'Helvetica,16'\n";
}

std::string end_picture() { return "unset multiplot\nset output\n"; }

std::string begin_panel(const PanelPlace& place, std::string_view x_title, std::string_view y_title) {
  return "unset arrow\nunset label\nunset object\nunset logscale\nunset key\nunset xzeroaxis\nset xtics "
         "autofreq\nset ytics autofreq\n"
         "set autoscale\nset format '%.10g'\nset tics nomirror "
         "out\nset border 3 lc rgb '#444444'\n"
         "set grid lc rgb '#dddddd' lw 0.7 dt 1\nset lmargin at screen " +
         to_text(place.left) + "\nset rmargin at screen " + to_text(place.right) +
         "\nset bmargin at screen " + to_text(place.bottom) + "\nset tmargin at screen " +
         to_text(place.top) + "\nset xlabel " + gnuplot_text(x_title) + "\nset ylabel " +
         gnuplot_text(y_title) + " offset 0,0\n";
}

std::string few_tics(std::string_view axis, double span, double least) {
  if (!(span > 0)) return "";
  constexpr double kMost = 5;
  const double decade = std::pow(10, std::floor(std::log10(span / kMost)));
  double step = 10 * decade;
  for (const double factor : {5.0, 2.0, 1.0})
    if (factor * decade >= span / kMost) step = factor * decade;
  return "set " + std::string(axis) + "tics " + to_text(std::max(step, least)) + "\n";
}

std::string logarithmic_tics(std::string_view axis, const AxisRange& range) {
  const double ratio = range.high() / range.low();
  if (!(range.low() > 0) || ratio > 100) return "";
  // The margins of the axis make it show a factor of 1.44 at least; neighbours in the fine list are nearer.
  const std::vector<double> steps =
      ratio > 5 ? std::vector<double>{1, 2, 5} : std::vector<double>{1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8};
  std::string places;
  const int first = static_cast<int>(std::floor(std::log10(range.low()))) - 1;
  for (int power = first; power <= first + 4; ++power)
    for (const double step : steps)
      places += (places.empty() ? "" : ",") + to_text(step * std::pow(10, power), 2);
  return "set " + std::string(axis) + "tics (" + places + ")\n";
}

std::string panel_heading(std::string_view text) {
  return "set label " + gnuplot_text(text) + " at graph 0, graph 1 left offset 0,0.8 font 'Helvetica,13'\n";
}

std::string key_at_foot() {
  return "set key at screen 0.53, screen 0.035 center center vertical maxrows 1 Left reverse samplen 3\n";
}

std::string upright_mark(double x, std::string_view word, double height, std::string_view side) {
  const std::string at = to_text(drawable(x)), grey(kGrey);
  std::string out =
      "set arrow from " + at + ", graph 0 to " + at + ", graph 1 nohead dt 2 lw 1.2 lc rgb '" + grey + "'\n";
  if (!word.empty())
    out += "set label " + gnuplot_text(word) + " at " + at + ", graph " + to_text(height) +
           (side == "left" ? " right offset -0.6,0" : " left offset 0.6,0") +
           " font 'Helvetica,12' tc rgb '" + grey + "'\n";
  return out;
}

std::string bars(std::string_view columns, std::string_view colour) {
  return "using " + std::string(columns) + " with vectors nohead lw 1.1 lc rgb '" + std::string(colour) +
         "' notitle";
}

std::string marker_size(std::size_t points) { return points > 400 ? "0.25" : points > 80 ? "0.4" : "0.7"; }

}  // namespace evenfield
