#include "report/plots.h"

#include <doctest/doctest.h>

#include <cstdlib>
#include <limits>

#include "report/gnuplot.h"
#include "report/made_up_result.h"
#include "report/plot_script.h"
#include "report/scratch_folder.h"

using namespace evenfield;
namespace fs = std::filesystem;

TEST_CASE("pictures are drawn for whatever data there are") {
  struct Row {
    const char* name;
    MadeUp shape;
    std::size_t files;
  };
  const Row rows[] = {{"one level", {1, 1, 3800, 0, true, 2}, 3},
                      {"fourteen levels", {}, 3},
                      {"two hundred levels", {200, 1, 60000, 1e-4}, 3},
                      {"tiny", {14, 1, 1e-3}, 3},
                      {"huge", {14, 1, 1e6, 0.002}, 3},
                      {"no darks", {14, 1, 3800, 0, false}, 3},
                      {"four regions", {3, 4}, 12},
                      {"extreme", {5, 1, 1e250}, 3},
                      {"vanishing", {5, 1, 1e-250}, 3}};
  for (const Row& row : rows) {
    CAPTURE(row.name);
    const ScratchFolder scratch("plots");
    const auto files = draw_plots(made_up_result(row.shape), scratch.path, {});
    REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
    CHECK(files->size() == row.files);
    for (const std::string& file : *files) {
      const std::string svg = text_of(scratch.path / file);
      CHECK(svg.size() > 5000);  // axes and at least one point; an empty picture has about 1000
      CHECK(svg.find("sans-serif") != std::string::npos);
    }
    CHECK(entries_of(scratch.path) == row.files);
  }
}

TEST_CASE("data that cannot be drawn leave out a picture, not the run") {
  const ScratchFolder scratch("odd");
  Characterization result;
  constexpr double kNan = std::numeric_limits<double>::quiet_NaN(),
                   kInf = std::numeric_limits<double>::infinity();
  RegionCurves curves;
  SUBCASE("nothing at all") {}
  SUBCASE("only numbers that are none") {
    curves.photon_transfer = {{kNan, 1, 1, 1.0, true}, {1, kInf, 1, {}, true}};
    curves.frame_means = {{0, SeriesKind::flat, kNan, 0, 0}};
  }
  result.curves = {curves};
  auto files = draw_plots(result, scratch.path, {});
  REQUIRE(files);
  CHECK(files->empty());

  // Zero, negative and equal values, absent fits, uncertainties that are none: all drawn.
  result.curves[0].photon_transfer = {
      {0, 0, 0, {}, true}, {-5, -5, kNan, kNan, false}, {1000, 5, kInf, 0.0, true}, {1, 1, -1, {}, false}};
  result.curves[0].response = {{0, 0, 0, 0.0, true}, {0, 0, 0, 0.0, true}};
  result.curves[0].frame_means = {{0, SeriesKind::dark, 1, 0, kNan}};
  result.curves[0].range_top_dn = kNan;
  files = draw_plots(result, scratch.path, {});
  REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
  CHECK(files->size() == 3);
}

TEST_CASE("the same result gives the same bytes") {
  const ScratchFolder one("same1"), two("same2");
  REQUIRE(draw_plots(made_up_result(), one.path, {}));
  REQUIRE(draw_plots(made_up_result(), two.path, {}));
  for (const PlotInfo& info : plot_table())
    CHECK(text_of(one.path / plot_file(info.name, 0)) == text_of(two.path / plot_file(info.name, 0)));
}

TEST_CASE("the name of a region cannot act, only show") {
  const ScratchFolder scratch("hostile");
  const fs::path trap = scratch.path / "trap";
  Characterization result = made_up_result({3, 2});
  const std::string orders[] = {"'; system('touch trap') #",
                                "\nsystem 'touch trap'\n",
                                "`touch trap`",
                                "@ARG0 $(touch trap)",
                                "</text><script>alert(1)</script>&amp;",
                                "\\\nEND_OF_DATA",
                                "{/Symbol a}_b^c",
                                "\x1b]0;x\x07\xff"};
  for (const std::string& order : orders) {
    CAPTURE(order);
    result.curves[0].region = order;
    const auto files = draw_plots(result, scratch.path, {});
    REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
    CHECK_FALSE(fs::exists(trap));
    const std::string svg = text_of(scratch.path / "response.svg");
    CHECK(svg.find("<script") == std::string::npos);
    for (const char c : svg)
      REQUIRE((static_cast<unsigned char>(c) >= 0x20 || c == '\n' || c == '\t' || c == '\r'));
  }
  CHECK(gnuplot_text("a'b\nc") == "'a''b\\x0ac'");
  CHECK(gnuplot_text(std::string(99, 'a') + "é") == "'" + std::string(99, 'a') + "...'");
}

TEST_CASE("a selection draws what it names and refuses what it does not know") {
  const ScratchFolder scratch("selected");
  auto selection = plot_selection({"response"});
  REQUIRE(selection);
  const auto files = draw_plots(made_up_result({3, 2}), scratch.path, *selection);
  REQUIRE(files);
  CHECK(*files == std::vector<std::string>{"response.svg", "response_2.svg"});
  CHECK(draw_plots(made_up_result(), scratch.path, *plot_selection({"none"}))->empty());
  CHECK(plot_selection({"all"})->all);
  const auto wrong = plot_selection({"respons"});
  REQUIRE_FALSE(wrong);
  CHECK(wrong.error().code == Errc::usage);
  CHECK(to_line(wrong.error()) ==
        "--plots: found \"respons\", expected of all, none, photon_transfer, response, frame_means, "
        "dark_signal, profiles, spectrograms, histograms, snr");
}

TEST_CASE("an error of gnuplot is one line") {
  const ScratchFolder scratch("gnuplot");
  const Status status = run_gnuplot("set nonsense\n", scratch.path);
  REQUIRE_FALSE(status);
  CHECK(status.error().code == Errc::output);
  CHECK(to_line(status.error()).find("line ") != std::string::npos);
  CHECK(to_line(status.error()).find('\n') == std::string::npos);
  CHECK_FALSE(run_gnuplot("", scratch.path / "missing"));
}
