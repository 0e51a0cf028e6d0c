#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <sstream>
#include <string>
#include <vector>

#include "report/curve_plots.h"
#include "report/histogram_panels.h"
#include "report/made_up_frames.h"
#include "report/made_up_result.h"
#include "report/plot_script.h"
#include "report/spatial_plots.h"

using namespace evenfield;

namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

/// Rows of the data block `name` of a script; none if it is not defined.
std::vector<std::vector<double>> rows_of(const std::string& script, const std::string& name) {
  std::vector<std::vector<double>> rows;
  const std::string head = "$" + name + " << END_OF_DATA\n";
  const std::size_t begin = script.find(head);
  if (begin == std::string::npos) return rows;
  std::istringstream block(script.substr(begin + head.size()));
  for (std::string line; std::getline(block, line) && line != "END_OF_DATA";) {
    std::istringstream row(line);
    rows.emplace_back();
    for (double value = 0; row >> value;) rows.back().push_back(value);
  }
  return rows;
}

double highest(const std::vector<std::vector<double>>& rows, std::size_t column) {
  double out = -std::numeric_limits<double>::infinity();
  for (const auto& row : rows) out = std::max(out, row.at(column));
  return out;
}

bool has(const std::string& script, const std::string& part) {
  return script.find(part) != std::string::npos;
}

RegionCurves whole_curves() {
  RegionCurves curves = made_up_result().curves[0];
  add_made_up_frames(curves);
  return curves;
}

}  // namespace

TEST_CASE("the curved model is drawn where it leaves the line and not where it lies on it") {
  RegionCurves curves = whole_curves();
  for (const CurvePoint& p : curves.photon_transfer) curves.photon_transfer_curved.push_back(*p.fitted);
  CHECK_FALSE(has(photon_transfer_script(curves, "t", "f.svg"), "curved model"));
  for (double& value : curves.photon_transfer_curved) value *= 0.97;
  const std::string script = photon_transfer_script(curves, "t", "f.svg");
  CHECK(has(script, "curved model"));
  const auto rows = rows_of(script, "linear_curve");
  // Fourteen levels, of which the brightest lies past the top of the range, where no model holds.
  REQUIRE(rows.size() == 13);
  CHECK(rows[0][1] == doctest::Approx(0.97 * *curves.photon_transfer[0].fitted));
  // Its residual is the distance of the two models: -3 % of the line over an uncertainty of 0.4 % of it.
  CHECK(rows_of(script, "residual_curve").at(0).at(1) == doctest::Approx(-7.5));
  curves.photon_transfer_curved.pop_back();  // points that do not belong together are left out
  CHECK_FALSE(has(photon_transfer_script(curves, "t", "f.svg"), "curved model"));
}

TEST_CASE("the dark line is led back to exposure 0, where the offset is") {
  RegionCurves curves;
  curves.dark_mean = {{10, 105.2, 0.1, 105.0, true}, {2, 101.1, 0.1, 101.0, true}, {4, 99, 0.1, {}, false}};
  const auto rows = rows_of(dark_signal_script(curves, "t", "f.svg"), "dark_line");
  // Through (2, 101) and (10, 105): 0.5 a second, 100 at 0.
  REQUIRE(rows.size() == 2);
  CHECK(rows[0] == std::vector<double>{0, 100});
  CHECK(rows[1] == std::vector<double>{10, 105});
  CHECK(rows_of(dark_signal_script(curves, "t", "f.svg"), "dark_other").size() == 1);
}

TEST_CASE("profiles of a large frame are thinned and keep each peak") {
  Profiles profiles;
  for (auto* line : {&profiles.middle, &profiles.mean, &profiles.lowest, &profiles.highest})
    line->assign(10000, 100.0);
  profiles.mean[1234] = 130;  // one bright column
  profiles.highest[77] = 4095;
  RegionCurves curves;
  curves.flat_frame.emplace();
  curves.flat_frame->along_row = profiles;
  const std::string script = profiles_script(curves, "t", "f.svg");
  const auto mean = rows_of(script, "flat_left_mean");
  CHECK(mean.size() <= 600);
  CHECK(highest(mean, 1) == 130);
  CHECK(has(script, "100 to 4095 DN"));
  // 100 to 130 and as much again: the pixel at 4095 ends at the edge and flattens nothing.
  CHECK(highest(rows_of(script, "flat_left_band"), 2) == 160);
  CHECK_FALSE(has(script, "flat_right"));
}

TEST_CASE("a spectrum keeps its peak, and nothing left of the pattern runs along the foot") {
  RegionCurves curves;
  curves.dark_frame.emplace();
  Spectrogram& s = curves.dark_frame->of_rows;
  s.length = 8000;
  s.amplitude_dn.assign(4001, 0.5);
  s.amplitude_dn[2000] = 40;
  s.amplitude_dn[10] = 0;
  s.white_dn = 0.5;
  s.temporal_dn = 0.2;
  s.non_whiteness = 1.25;
  const std::string script = spectrograms_script(curves, "t", "f.svg");
  const auto line = rows_of(script, "dark_left_line");
  CHECK(line.size() <= 600);
  CHECK(highest(line, 1) == 40);
  for (const auto& row : line) {
    CHECK(row.at(1) > 0);
    if (row.at(1) == 40) CHECK(std::abs(row.at(0) - 0.25) < 0.5 / 300);
  }
  CHECK(rows_of(script, "dark_left_white").at(1) == std::vector<double>{0.5, 0.5});
  CHECK(rows_of(script, "dark_left_temporal").at(1) == std::vector<double>{0.5, 0.2});
  CHECK(has(script, "variance 1.25 × white"));
}

TEST_CASE("histograms keep every pixel when bins are taken together") {
  RegionCurves curves;
  curves.dark_frame.emplace();
  MeanFrame& frame = *curves.dark_frame;
  frame.values = {10, 0.25, std::vector<std::int64_t>(1000, 3)};
  const std::string script = histograms_script(curves, "t", "f.svg");
  const auto rows = rows_of(script, "dark_left_counts");
  // 1000 bins in fours are 250, two edges each; 10 - 0.125 is the left edge, 1000 bins of 0.25 the width.
  REQUIRE(rows.size() == 500);
  CHECK(rows.front()[0] == doctest::Approx(9.875));
  CHECK(rows.back()[0] == doctest::Approx(259.875));
  double pixels = 0;
  for (const auto& row : rows) pixels += row[2] / 2;
  CHECK(pixels == 3000);
  CHECK(has(script, "pixels per 1 DN"));
}

TEST_CASE("the normal curve has the area of the pixels and the width of the white part") {
  RegionCurves curves;
  curves.flat_frame.emplace();
  MeanFrame& frame = *curves.flat_frame;
  frame.mean_dn = 50;
  frame.normal_dn = 2;
  frame.values = {40, 0.2, std::vector<std::int64_t>(100, 100)};
  frame.deviations = {0, 0.2, std::vector<std::int64_t>(51)};
  for (std::size_t i = 0; i < 51; ++i) frame.deviations.counts[i] = std::int64_t(10000 - 200 * i);
  const std::string script = histograms_script(curves, "t", "f.svg");
  // Within 0.05 standard deviations of the mean lies 0.0398776 of a normal distribution, of 10000 pixels
  // 398.776.
  const auto normal = rows_of(script, "flat_left_normal");
  CHECK(highest(normal, 1) == doctest::Approx(398.776));
  CHECK(normal.front()[0] > 40);  // it ends where less than half a pixel is expected, near 3.6 deviations
  // Half the pixels, and 0.3173105 of them beyond one standard deviation (tables of the normal distribution).
  const auto far = rows_of(script, "flat_right_normal");
  CHECK(far.front()[1] == doctest::Approx(10000));
  double at_one = 0;
  for (std::size_t i = 1; i < far.size(); ++i)
    if (far[i - 1][0] <= 2 && far[i][0] > 2)
      at_one =
          far[i - 1][1] + (far[i][1] - far[i - 1][1]) * (2 - far[i - 1][0]) / (far[i][0] - far[i - 1][0]);
  CHECK(at_one == doctest::Approx(3173.1).epsilon(0.005));
  frame.normal_dn = 0;
  CHECK(rows_of(histograms_script(curves, "t", "f.svg"), "flat_left_normal").empty());
}

TEST_CASE("the farthest pixel is never lost from the accumulated histogram") {
  RegionCurves curves;
  curves.dark_frame.emplace();
  MeanFrame& frame = *curves.dark_frame;
  frame.deviations = {0, 1, std::vector<std::int64_t>(5000, 0)};
  frame.deviations.counts[0] = 1000;
  for (std::size_t i = 1; i <= 4321; ++i) frame.deviations.counts[i] = 1;
  const auto rows = rows_of(histograms_script(curves, "t", "f.svg"), "dark_right_counts");
  double farthest = 0;
  for (const auto& row : rows)
    if (row[2] >= 1) farthest = row[0];
  CHECK(farthest == 4321);
  CHECK(rows.size() <= 262);
}

TEST_CASE("signal over noise: expected curves, threshold and what has no place on logarithmic axes") {
  RegionCurves curves;
  SnrCurve snr;
  snr.points = {{100, 9, 0.2},  {0, 0, 0},       {-5, 1, 0},     {kNan, 2, 0},
                {400, kNan, 0}, {900, 25, kNan}, {10500, 1e6, 1}};
  snr.dark_noise_e = std::sqrt(6);
  snr.dsnu_e = 3;
  snr.prnu = 0.1;
  snr.saturation_e = 10000;
  curves.snr = snr;
  const std::string script = snr_script(curves, "t", "f.svg");
  CHECK(rows_of(script, "measured").size() == 2);
  // s^2 = s + 6 has the root 3; a third of it is where the curves begin.
  const auto temporal = rows_of(script, "temporal"), pattern = rows_of(script, "pattern"),
             ideal = rows_of(script, "ideal");
  CHECK(temporal.front()[0] == doctest::Approx(1));
  CHECK(temporal.front()[1] == doctest::Approx(1 / std::sqrt(7)));
  CHECK(temporal.back()[0] == doctest::Approx(10500));
  // 10500 / sqrt(10500 + 6 + 9 + 1050^2), and the root of 10500.
  CHECK(pattern.back()[1] == doctest::Approx(10500 / std::sqrt(1113015.0)));
  CHECK(ideal.back()[1] == doctest::Approx(102.4695));
  // The level past saturation is shown as such, no higher than the root of its signal, not at its 1e6.
  CHECK(rows_of(script, "saturated").at(0).at(1) == doctest::Approx(102.4695));
  const std::size_t y_axis = script.rfind("set yrange [");
  REQUIRE(y_axis != std::string::npos);
  CHECK(std::stod(script.substr(script.find(':', y_axis) + 1)) < 300);
  const std::size_t mark = script.find("'signal equals noise'");
  REQUIRE(mark != std::string::npos);
  CHECK(std::stod(script.substr(script.find("at ", mark) + 3)) == doctest::Approx(3));
  CHECK(has(script, "'saturation' at 10000,"));
  curves.snr->dsnu_e.reset();
  curves.snr->prnu.reset();
  curves.snr->saturation_e.reset();
  const std::string bare = snr_script(curves, "t", "f.svg");
  CHECK(rows_of(bare, "pattern").empty());
  CHECK_FALSE(has(bare, "saturation"));
}

TEST_CASE("tics are few and round") {
  CHECK(few_tics("x", 100) == "set xtics 20\n");
  CHECK(few_tics("x", 1280, 1) == "set xtics 500\n");
  CHECK(few_tics("y", 4e-7) == "set ytics 1e-07\n");
  CHECK(few_tics("x", 3, 1) == "set xtics 1\n");  // pixels are whole
  CHECK(few_tics("x", 0).empty());
  AxisRange range;
  for (const double value : {0.24, 0.71}) range.add(value);
  const std::string tics = logarithmic_tics("y", range);
  for (const char* part : {"set ytics (", ",0.25,", ",0.5,"}) CHECK_MESSAGE(has(tics, part), part);
  range.add(100);
  CHECK(logarithmic_tics("y", range).empty());
}

TEST_CASE("without data there is no script") {
  RegionCurves curves;
  curves.snr.emplace();
  curves.dark_frame.emplace();
  curves.flat_frame.emplace();
  curves.flat_frame->along_row.mean = {kNan, kNan};
  curves.flat_frame->of_rows = {4, 1, {kNan, 0, 0}, 1, 1, 1};
  curves.flat_frame->values = {kNan, 1, {5}};
  curves.flat_frame->deviations = {0, 1, {0, 0}};
  curves.dark_mean = {{kNan, 1, 1, {}, true}};
  for (const auto script :
       {dark_signal_script, profiles_script, spectrograms_script, histograms_script, snr_script})
    CHECK(script(curves, "t", "f.svg").empty());
}
