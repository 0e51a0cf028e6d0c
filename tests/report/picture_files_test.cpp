#include <doctest/doctest.h>

#include <limits>

#include "report/made_up_frames.h"
#include "report/made_up_result.h"
#include "report/plots.h"
#include "report/scratch_folder.h"

using namespace evenfield;
namespace fs = std::filesystem;

namespace {

/// "</svg>" is the last thing of a whole file; an empty picture has about 1000 bytes.
void check_whole(const fs::path& file) {
  CAPTURE(file.filename().string());
  const std::string svg = text_of(file);
  CHECK(svg.size() > 5000);
  const std::size_t end = svg.rfind("</svg>");
  REQUIRE(end != std::string::npos);
  CHECK(svg.find_first_not_of(" \n\r\t", end + 6) == std::string::npos);
  CHECK(svg.find("nan") == std::string::npos);
}

Characterization with_everything(double unit, int columns, int rows) {
  Characterization result = made_up_result({14, 1, 3800 * unit});
  add_made_up_frames(result.curves[0], unit, columns, rows);
  return result;
}

}  // namespace

TEST_CASE("a result with everything gives every picture, at any scale and size") {
  struct Row {
    const char* name;
    double unit;
    int columns, rows;
    std::size_t files = plot_table().size();
  };
  for (const Row& row :
       {Row{"plain", 1, 320, 200}, Row{"tiny", 1e-3, 64, 64}, Row{"huge", 1e9, 100, 100},
        Row{"one pixel", 1, 1, 1}, Row{"wide", 1, 12000, 3},
        Row{"vanishing", 1e-250, 8, 8, 6},  // zeros have no place on the axes of spectra and ratios

        Row{"extreme", 1e250, 8, 8}}) {
    CAPTURE(row.name);
    const ScratchFolder scratch("pictures");
    const auto files = draw_plots(with_everything(row.unit, row.columns, row.rows), scratch.path, {});
    REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
    CHECK(files->size() == row.files);
    for (const std::string& file : *files) {
      check_whole(scratch.path / file);
      CHECK(fs::file_size(scratch.path / file) < 400'000);  // a page holds them all
    }
  }
}

TEST_CASE("values that are equal, zero or none are drawn or left out, never an error") {
  constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
  Characterization result;
  RegionCurves curves;
  MeanFrame frame;
  frame.mean_dn = 7;
  frame.along_row = frame.along_column = {{7, 7, kNan}, {7, 7, 7}, {7, kNan, 7}, {7, 7, 7}};
  frame.of_rows = frame.of_columns = {2, 2, {0, 1e-300}, 0, kNan, 0};
  frame.values = {7, 0, {6}};
  frame.deviations = {0, 0, {6}};
  SUBCASE("small") {}
  SUBCASE("zero") {
    frame.mean_dn = 0;
    frame.along_row = frame.along_column = {{0}, {0}, {0}, {0}};
    frame.of_rows = frame.of_columns = {1, 1, {5}, 5, 5, 1};
    frame.values.first = 0;
  }
  curves.flat_frame = curves.dark_frame = frame;
  curves.dark_mean = {{0, 7, kNan, kNan, true}, {0, 7, 0, 7.0, true}};
  curves.snr = SnrCurve{{{5, 5, 5}}, 0, {}, {}, {}};
  result.curves = {curves};
  const ScratchFolder scratch("equal");
  const auto files = draw_plots(result, scratch.path, {});
  REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
  for (const std::string& file : *files) check_whole(scratch.path / file);
  CHECK(fs::exists(scratch.path / "profiles.svg"));
  CHECK(fs::exists(scratch.path / "histograms.svg"));
  CHECK(fs::exists(scratch.path / "dark_signal.svg"));
  CHECK(fs::exists(scratch.path / "snr.svg"));
}

TEST_CASE("a region without a mean frame has none of its pictures") {
  Characterization result = made_up_result({3, 2});
  add_made_up_frames(result.curves[1]);
  result.curves[1].dark_frame.reset();
  const ScratchFolder scratch("second");
  const auto files = draw_plots(result, scratch.path, {});
  REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
  CHECK_FALSE(fs::exists(scratch.path / "profiles.svg"));
  CHECK(fs::exists(scratch.path / "profiles_2.svg"));
  CHECK(text_of(scratch.path / "profiles_2.svg").find("flat of 16 frames") != std::string::npos);
  CHECK(text_of(scratch.path / "profiles_2.svg").find("dark of 16 frames") == std::string::npos);
}

TEST_CASE("no picture lets the name of a region act") {
  Characterization result = made_up_result({3, 2});
  for (RegionCurves& curves : result.curves) add_made_up_frames(curves);
  const ScratchFolder scratch("acting");
  result.curves[0].region = "'; system('touch trap') #\nsystem 'touch trap'\n`touch trap`";
  result.curves[1].region = "END_OF_DATA\n</text><script>x</script>";
  const auto files = draw_plots(result, scratch.path, {});
  REQUIRE_MESSAGE(files, (files ? "" : to_line(files.error())));
  CHECK(files->size() == 2 * plot_table().size());
  CHECK(entries_of(scratch.path) == files->size());  // no trap
  for (const std::string& file : *files)
    CHECK(text_of(scratch.path / file).find("<script") == std::string::npos);
}
