#include <doctest/doctest.h>

#include <string>

#include "ingest/session_reader.h"
#include "session_folder.h"

namespace evenfield {
namespace {

/// A session of 64 x 48 pixels whose first region starts in line 2 with the lines of `body`.
std::string region_error(const std::string& body) {
  const SessionFolder folder;
  folder.write("dark.tif", tiff_bytes(64, 48));
  const auto opened = read_session_text(
      "schema = 1\n[[region]]\n" + body + "[[series]]\nkind = \"dark\"\nfiles = [\"dark.tif\"]\n",
      folder.path() / "s.toml", 1);
  if (opened) return "";
  return to_line(opened.error()).substr(folder.path().string().size() + 1);
}

const std::string kInside = "name = \"left\"\nx = 0\ny = 0\nwidth = 32\nheight = 48\n";  // lines 3 to 7

TEST_CASE("a region inside the frame is taken, up to its last pixel") {
  CHECK(region_error(kInside) == "");
  CHECK(region_error("name = \"corner\"\nx = 56\ny = 40\nwidth = 8\nheight = 8\n") == "");
  CHECK(region_error(kInside + "overscan = [63, 47, 1, 1]\n") == "");
}

TEST_CASE("a region outside the frame is an error") {
  CHECK(region_error("name = \"left\"\nx = 33\ny = 0\nwidth = 32\nheight = 48\n") ==
        "s.toml, line 2, region[1]: found a region of columns 33 to 64 and rows 0 to 47, expected it inside "
        "the frame of "
        "64 x 48 pixels");
  CHECK(region_error("name = \"left\"\nx = 0\ny = 2147483647\nwidth = 32\nheight = 2147483647\n") ==
        "s.toml, line 2, region[1]: found a region of columns 0 to 31 and rows 2147483647 to 4294967293, "
        "expected it "
        "inside the frame of 64 x 48 pixels");
  CHECK(region_error("name = \"left\"\nx = -1\ny = 0\nwidth = 32\nheight = 48\n") ==
        "s.toml, line 4, region[1].x: found -1, expected an integer from 0 to 2147483647");
  CHECK(region_error(kInside + "overscan = [60, 0, 5, 48]\n") ==
        "s.toml, line 8, region[1].overscan: found an overscan of columns 60 to 64 and rows 0 to 47, "
        "expected it inside "
        "the frame of 64 x 48 pixels");
}

TEST_CASE("a region too small or cut short is an error") {
  CHECK(region_error("name = \"left\"\nx = 0\ny = 0\nwidth = 7\nheight = 48\n") ==
        "s.toml, line 6, region[1].width: found 7, expected an integer from 8 to 2147483647");
  CHECK(region_error("name = \"left\"\nx = 0\ny = 0\nwidth = 32\n") ==
        "s.toml, line 2, region[1].height: found no such key, expected one");
  CHECK(region_error(kInside + "overscan = [32, 0, 0, 48]\n") ==
        "s.toml, line 8, region[1].overscan[3]: found 0, expected an integer from 1 to 2147483647");
  CHECK(region_error(kInside + "overscan = [32, 0, 4]\n") ==
        "s.toml, line 8, region[1].overscan: found a list of 3, expected a list of 4 integers");
}

TEST_CASE("an overscan must not hold pixels of its region") {
  CHECK(region_error(kInside + "overscan = [31, 0, 4, 48]\n") ==
        "s.toml, line 8, region[1].overscan: found an overscan that overlaps its region, expected pixels "
        "outside it");
}

TEST_CASE("names of regions are present, different and plain") {
  CHECK(region_error(kInside + "[[region]]\n" + kInside) ==
        "s.toml, line 9, region[2].name: found \"left\", expected a name other than that of region[1]");
  const auto named = [](const std::string& name) {
    return region_error("name = \"" + name + "\"\nx = 0\ny = 0\nwidth = 32\nheight = 48\n");
  };
  CHECK(named("") == "s.toml, line 3, region[1].name: found \"\", expected a name of at least one character");
  CHECK(named("a@b") ==
        "s.toml, line 3, region[1].name: found \"a@b\", expected a name without @ and control characters");
  CHECK(
      named("a\\tb") ==
      "s.toml, line 3, region[1].name: found \"a\\x09b\", expected a name without @ and control characters");
  CHECK(named("whole") ==
        "s.toml, line 3, region[1].name: found \"whole\", expected another name: this one stands for "
        "the whole frame of a session without regions");
  CHECK(
      region_error(kInside + "reads_toward = \"north\"\n") ==
      "s.toml, line 8, region[1].reads_toward: found the string \"north\", expected left, right, up or down");
}

}  // namespace
}  // namespace evenfield
