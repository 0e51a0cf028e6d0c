#include "report/report.h"

#include <doctest/doctest.h>

#include <cstdlib>
#include <limits>

#include "report/made_up_result.h"
#include "report/output_folder.h"
#include "report/scratch_folder.h"
#include "result/result_json.h"

using namespace evenfield;
namespace fs = std::filesystem;

TEST_CASE("a report holds every file it lists and no other, and is recognized as ours") {
  const ScratchFolder scratch("report");
  const auto outcome = write_report(made_up_result({14, 2}), scratch.path, {});
  REQUIRE(outcome);
  CHECK(outcome->message.empty());
  std::size_t found = 0;
  for (const auto& entry : fs::recursive_directory_iterator(scratch.path))
    found += entry.is_regular_file() ? 1U : 0U;
  CHECK(found == outcome->files.size());
  CHECK(outcome->files.size() == 5 + 6);
  for (const fs::path& file : outcome->files) CHECK(fs::file_size(scratch.path / file) > 0);
  CHECK(is_own_output(scratch.path));
  const auto back = read_result(scratch.path / "result.json");
  REQUIRE(back);
  CHECK(back->quantities.size() == made_up_result({14, 2}).quantities.size());
  std::size_t images = 0;
  const std::string html = text_of(scratch.path / "report.html");
  for (std::size_t at = 0; (at = html.find("base64,", at)) != std::string::npos; ++at) ++images;
  CHECK(images == 6);
}

TEST_CASE("without gnuplot everything but the pictures is there, with a message") {
  const ScratchFolder scratch("no_gnuplot"), empty("empty_path");
  const std::string path = std::getenv("PATH") != nullptr ? std::getenv("PATH") : "";
  ::setenv("PATH", empty.path.c_str(), 1);
  const auto outcome = write_report(made_up_result(), scratch.path, {});
  ::setenv("PATH", path.c_str(), 1);
  REQUIRE(outcome);
  CHECK(outcome->message ==
        "No pictures: gnuplot: found none installed, expected a program that draws the plots");
  CHECK(outcome->files.size() == 5);
  CHECK_FALSE(fs::exists(scratch.path / "plots"));
  CHECK(text_of(scratch.path / "report.html").find("none installed") != std::string::npos);
}

TEST_CASE("pictures that nobody asked for are not drawn and not missed") {
  const ScratchFolder scratch("none");
  const auto outcome = write_report(made_up_result(), scratch.path, {*plot_selection({"none"})});
  REQUIRE(outcome);
  CHECK(outcome->message.empty());
  CHECK(outcome->files.size() == 5);
}

TEST_CASE("a report that cannot be written is an error") {
  const ScratchFolder scratch("unwritable");
  CHECK_FALSE(write_report(made_up_result(), scratch.path / "missing", {}));
  Characterization broken = made_up_result();
  broken.quantities[0].value = std::numeric_limits<double>::infinity();
  const auto outcome = write_report(broken, scratch.path, {});
  REQUIRE_FALSE(outcome);
  CHECK(outcome.error().where.key == "quantities[0].value");
  CHECK(entries_of(scratch.path) == 0);
}
