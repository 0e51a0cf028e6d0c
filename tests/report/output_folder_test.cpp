#include "report/output_folder.h"

#include <doctest/doctest.h>

#include "report/scratch_folder.h"
#include "result/result_json.h"

using namespace evenfield;
namespace fs = std::filesystem;

namespace {

void write_own_output(const fs::path& folder, const std::string& word) {
  fs::create_directories(folder / "plots");
  Characterization result;
  result.created = word;
  std::ofstream(folder / "result.json") << *to_json(result);
  std::ofstream(folder / "plots" / "response.svg") << "<svg/>";
}

bool begins(const fs::path& folder) { return static_cast<bool>(OutputFolder::begin(folder)); }

}  // namespace

TEST_CASE("the folder appears whole on commit and not before") {
  const ScratchFolder scratch("appears");
  const fs::path target = scratch.path / "new" / "out";  // the parent is made as well
  auto output = OutputFolder::begin(target);
  REQUIRE(output);
  REQUIRE(write_text_file(output->path() / "a.txt", "text"));
  CHECK_FALSE(fs::exists(target));
  REQUIRE(output->commit());
  CHECK(text_of(target / "a.txt") == "text");
  CHECK(entries_of(target.parent_path()) == 1);
  CHECK_FALSE(output->commit());
}

TEST_CASE("without commit the old output stays and nothing else is left") {
  const ScratchFolder scratch("aborted");
  const fs::path target = scratch.path / "out";
  write_own_output(target, "old");
  {
    auto output = OutputFolder::begin(target);
    REQUIRE(output);
    write_own_output(output->path(), "new");
    const OutputFolder moved = std::move(*output);  // a move must not remove the folder twice, nor too early
    CHECK(fs::exists(moved.path() / "result.json"));
  }
  CHECK(read_result(target / "result.json")->created == "old");
  CHECK(entries_of(scratch.path) == 1);
}

TEST_CASE("our own output is replaced as a whole") {
  const ScratchFolder scratch("replaced");
  const fs::path target = scratch.path / "out";
  write_own_output(target, "old");
  auto output = OutputFolder::begin(target.string() + "/");
  REQUIRE(output);
  Characterization result;
  result.created = "new";
  REQUIRE(write_text_file(output->path() / "result.json", *to_json(result)));
  REQUIRE(output->commit());
  CHECK(read_result(target / "result.json")->created == "new");
  CHECK_FALSE(fs::exists(target / "plots"));
  CHECK(entries_of(scratch.path) == 1);
}

TEST_CASE("any other folder is refused and left alone") {
  const ScratchFolder scratch("refused");
  const fs::path target = scratch.path / "out";
  SUBCASE("with a note of the user beside our files") {
    write_own_output(target, "old");
    std::ofstream(target / "note.txt") << "mine";
  }
  SUBCASE("with a result of another program") {
    fs::create_directories(target);
    std::ofstream(target / "result.json") << R"({"schema": "other/1"})";
  }
  SUBCASE("with something else among the plots") {
    write_own_output(target, "old");
    std::ofstream(target / "plots" / "mine.png") << "png";
  }
  SUBCASE("with a link in place of the result") {
    write_own_output(scratch.path / "elsewhere", "old");
    fs::create_directories(target);
    fs::create_symlink(scratch.path / "elsewhere" / "result.json", target / "result.json");
  }
  SUBCASE("with files only") {
    fs::create_directories(target);
    std::ofstream(target / "flat.tif") << "II";
  }
  const std::size_t before = entries_of(target), beside = entries_of(scratch.path);
  const auto output = OutputFolder::begin(target);
  REQUIRE_FALSE(output);
  CHECK(output.error().code == Errc::output);
  CHECK(to_line(output.error()).find("expected an empty or a new one") != std::string::npos);
  CHECK(entries_of(target) == before);
  CHECK(entries_of(scratch.path) == beside);
}

TEST_CASE("a file that arrives in the old folder during the run is not lost") {
  const ScratchFolder scratch("late");
  const fs::path target = scratch.path / "out";
  write_own_output(target, "old");
  auto output = OutputFolder::begin(target);
  REQUIRE(output);
  std::ofstream(target / "note.txt") << "mine";
  CHECK_FALSE(output->commit());
  CHECK(text_of(target / "note.txt") == "mine");
}

TEST_CASE("the output of several sessions is ours as well") {
  const ScratchFolder scratch("several");
  const fs::path target = scratch.path / "out";
  write_own_output(target / "monday", "1");
  write_own_output(target / "tuesday", "2");
  CHECK_FALSE(begins(target));
  std::ofstream(target / "summary.csv") << "session\n";
  CHECK(begins(target));
  std::ofstream(target / "monday" / "note.txt") << "mine";
  CHECK_FALSE(begins(target));
}

TEST_CASE("an empty folder is used, a file and the current folder are refused") {
  const ScratchFolder scratch("kinds");
  fs::create_directory(scratch.path / "empty");
  std::ofstream(scratch.path / "file") << "x";
  auto output = OutputFolder::begin(scratch.path / "empty");
  REQUIRE(output);
  CHECK(output->commit());
  CHECK(fs::is_directory(scratch.path / "empty"));
  CHECK_FALSE(begins(scratch.path / "file"));
  CHECK_FALSE(begins("."));
  CHECK_FALSE(begins(".."));
  CHECK_FALSE(begins(""));
  CHECK_FALSE(begins("/"));
}

TEST_CASE("a full disk is an error that names the file") {
  // /dev/full of Linux: every write fails as on a full disk.
  const Status status = write_text_file("/dev/full", "text");
  REQUIRE_FALSE(status);
  CHECK(to_line(status.error()) ==
        "/dev/full: found \"No space left on device\", expected a file that can be written");
  CHECK(status.error().code == Errc::output);
  CHECK_FALSE(write_text_file("/no/such/folder/file", "text"));
}
