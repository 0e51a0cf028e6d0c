#include "formats/toml_document.h"

#include <doctest/doctest.h>

#include <limits>
#include <string>

#include "formats/toml_scan.h"

namespace evenfield {
namespace {

/// The line a user would see after `read` asked for its keys; "" without an error.
template <class Read>
std::string error_line(const std::string& text, const Read& read) {
  auto document = TomlDocument::parse(text, "s.toml");
  if (!document) return to_line(document.error());
  TomlTable root = document->root();
  read(root);
  const Status status = document->finish();
  return status ? "" : to_line(status.error());
}

std::string error_line(const std::string& text) {
  return error_line(text, [](TomlTable&) {});
}

std::optional<int> obstacle_line(const std::string& text, int max_parts) {
  const auto obstacle = find_toml_obstacle(text, max_parts);
  return obstacle ? std::optional(obstacle->line) : std::nullopt;
}

std::string repeated(const std::string& text, int times) {
  std::string out;
  for (int i = 0; i < times; ++i) out += text;
  return out;
}

TEST_CASE("values come back as they stand in the file") {
  auto document = TomlDocument::parse(
      "name = \"bay 3\"\ncount = 7\nrate = 2.1e-3\nwhole = 5\non = true\n"
      "box = [1, -2, 3]\nlevels = [1, 2.5]\nfiles = ['a', \"b\"]\n[inner]\nmode = \"slow\"\n[[part]]\nx = "
      "1\n[[part]]\nx = 2\n",
      "s.toml");
  REQUIRE(document);
  TomlTable root = document->root();
  CHECK(root.text("name") == "bay 3");
  CHECK(root.integer("count", 1, 10) == 7);
  CHECK(root.number("rate", {0, 1}) == 2.1e-3);
  CHECK(root.number("whole", {0, 10}) == 5.0);
  CHECK(root.boolean("on") == true);
  CHECK(root.integers("box", 3) == std::vector<std::int64_t>{1, -2, 3});
  CHECK(root.numbers("levels") == std::vector<double>{1, 2.5});
  CHECK(root.texts("files") == std::vector<std::string>{"a", "b"});
  CHECK(root.table("inner")->one_of("mode", {"slow", "fast"}) == "slow");
  auto parts = root.tables("part");
  REQUIRE(parts.size() == 2);
  CHECK(parts[0].integer("x", 0, 9) == 1);
  CHECK(parts[1].integer("x", 0, 9) == 2);
  CHECK_FALSE(root.text("absent"));
  CHECK(document->finish());
}

TEST_CASE("keys and single values are listed in the order of the file, not of the alphabet") {
  auto document =
      TomlDocument::parse("zebra = 1\napple = \"x\"\nmango = 2.5\nlist = [1]\nday = 2026-11-24\n", "s.toml");
  REQUIRE(document);
  const TomlTable root = document->root();
  CHECK(root.keys() == std::vector<std::string>{"zebra", "apple", "mango", "list", "day"});
  const std::vector<std::pair<std::string, TomlScalar>> expected{{"zebra", std::int64_t{1}},
                                                                 {"apple", std::string("x")},
                                                                 {"mango", 2.5},
                                                                 {"day", std::string("2026-11-24")}};
  CHECK(root.scalars() == expected);
}

TEST_CASE("a time is brought to UTC") {
  struct Row {
    const char* written;
    const char* utc;
  };
  // By hand: hours and minutes of the offset subtracted; 2028 is a leap year.
  for (const Row& row : {Row{"2026-11-24T09:30:00Z", "2026-11-24T09:30:00Z"},
                         Row{"2026-11-24 09:30:00.250+02:00", "2026-11-24T07:30:00.25Z"},
                         Row{"2026-12-31T23:45:10-00:30", "2027-01-01T00:15:10Z"},
                         Row{"2028-03-01T00:30:00+01:00", "2028-02-29T23:30:00Z"}}) {
    CAPTURE(row.written);
    auto document = TomlDocument::parse("t = " + std::string(row.written) + "\n", "s.toml");
    REQUIRE(document);
    CHECK(document->root().time("t") == row.utc);
  }
  CHECK(error_line("t = 2026-11-24T09:30:00\n", [](TomlTable& t) { t.time("t"); }) ==
        "s.toml, line 1, t: found the time 2026-11-24T09:30:00 without an offset, expected a date and time "
        "with its "
        "offset, such as 2026-11-24T09:30:00Z");
}

TEST_CASE("a wrong type or range is one line with file, line, key, what was found and what was expected") {
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  CHECK(error_line("\nspeed = \"fast\"\n", [](TomlTable& t) {
          t.number("speed", {0, 100000});
        }) == "s.toml, line 2, speed: found the string \"fast\", expected a number from 0 to 100000");
  CHECK(error_line("x = -1\n", [](TomlTable& t) {
          t.number("x", {0, kInfinity});
        }) == "s.toml, line 1, x: found -1, expected a number of at least 0");
  CHECK(error_line("x = 0.0\n", [](TomlTable& t) {
          t.number("x", {0, kInfinity, true});
        }) == "s.toml, line 1, x: found 0, expected a number greater than 0");
  CHECK(error_line("x = nan\n", [](TomlTable& t) {
          t.number("x", {-kInfinity, kInfinity});
        }) == "s.toml, line 1, x: found nan, expected a finite number");
  CHECK(error_line("x = inf\n", [](TomlTable& t) {
          t.number("x", {0, kInfinity});
        }) == "s.toml, line 1, x: found inf, expected a number of at least 0");
  CHECK(error_line("x = 1.5\n", [](TomlTable& t) { t.integer("x", 1, 3); }) ==
        "s.toml, line 1, x: found 1.5, expected an integer from 1 to 3");
  CHECK(error_line("x = 2\n", [](TomlTable& t) { t.integer("x", 1, 1); }) ==
        "s.toml, line 1, x: found 2, expected 1");
  CHECK(error_line("x = [1]\n", [](TomlTable& t) { t.boolean("x"); }) ==
        "s.toml, line 1, x: found a list of 1, expected true or false");
  CHECK(error_line("x = true\n", [](TomlTable& t) { t.text("x"); }) ==
        "s.toml, line 1, x: found true, expected a string");
  CHECK(error_line("x = \"fats\"\n", [](TomlTable& t) {
          t.one_of("x", {"flat", "dark", "bias"});
        }) == "s.toml, line 1, x: found the string \"fats\", expected flat, dark or bias");
  CHECK(error_line("x = []\n", [](TomlTable& t) { t.texts("x"); }) ==
        "s.toml, line 1, x: found an empty list, expected a list of one or more strings");
  CHECK(error_line("x = [1, 2]\n", [](TomlTable& t) { t.integers("x", 4); }) ==
        "s.toml, line 1, x: found a list of 2, expected a list of 4 integers");
  CHECK(error_line("x = 3\n", [](TomlTable& t) { t.table("x"); }) ==
        "s.toml, line 1, x: found 3, expected a table, [x]");
  CHECK(error_line("[x]\n", [](TomlTable& t) { t.tables("x"); }) ==
        "s.toml, line 1, x: found a table, expected a list of tables, [[x]]");
}

TEST_CASE("an entry of a list is named by its place and its own line") {
  CHECK(error_line("[[series]]\n[[series]]\nfiles = [\n  \"a\",\n  5,\n]\n", [](TomlTable& t) {
          for (TomlTable& series : t.tables("series")) series.texts("files");
        }) == "s.toml, line 5, series[2].files[2]: found 5, expected a string");
}

TEST_CASE("the first error stays, and getters answer nothing after it") {
  CHECK(error_line("a = 1\nb = 2\n", [](TomlTable& t) {
          t.text("a");
          CHECK_FALSE(t.integer("b", 0, 9));
          t.fail("b", "later");
        }) == "s.toml, line 1, a: found 1, expected a string");
}

TEST_CASE("a missing key is told apart from a misspelt one") {
  CHECK(error_line("[part]\n", [](TomlTable& t) { t.table("part")->require("name"); }) ==
        "s.toml, line 1, part.name: found no such key, expected one");
  CHECK(error_line("[part]\nnmae = 1\n", [](TomlTable& t) { t.table("part")->require("name"); }) ==
        "s.toml, line 1, part.name: found no such key (but nmae), expected one");
}

TEST_CASE("the first unknown key of the file is an error that offers near names") {
  const auto read = [](TomlTable& t) {
    if (auto camera = t.table("camera")) camera->text("serial");
    for (TomlTable& series : t.tables("series")) series.number("exposure_s", {0, 1});
  };
  CHECK(error_line("[camera]\nserial = \"1\"\n[[series]]\nexposure_s = 1\n", read).empty());
  CHECK(error_line("[[series]]\n[[series]]\nexposre_s = 1\n[camera]\nfoo = 1\n", read) ==
        "s.toml, line 3, series[2].exposre_s: found an unknown key, expected exposure_s");
  CHECK(error_line("[elsewhere]\nx = 1\n", read) ==
        "s.toml, line 1, elsewhere: found an unknown key, expected camera or series");
  CHECK(error_line("\"odd key\" = 1\n", read) ==
        "s.toml, line 1, \"odd key\": found an unknown key, expected camera or series");
}

TEST_CASE("text that is not TOML is an error with line and column") {
  const std::string line = error_line("a = 1\nb = = 2\n");
  CHECK(line.find("s.toml, line 2: found text that is not TOML at column 5 (") == 0);
  CHECK(line.find("expected TOML 1.0") != std::string::npos);
  CHECK(error_line("a = \"\xFF\"\n").find("s.toml, line 1: found text that is not TOML") == 0);
  CHECK(error_line("a = 1\na = 2\n").find("s.toml, line 2: found text that is not TOML") == 0);
  CHECK(error_line(std::string("a = 1\n\0b = 2\n", 12)).find("s.toml, line 2: found text that is not TOML") ==
        0);
}

TEST_CASE("what the parser itself would stumble over is an error with its line") {
  CHECK(error_line("a = \"]\" # }\nb = [10,} 0, 1]\n") == "s.toml, line 2: found }, expected ]");
  CHECK(error_line("a = [\"\"\"}\n\"\"\"]\nb = {]\n") == "s.toml, line 3: found ], expected }");
  CHECK(error_line("\nwid\xCA\x8A= 10\n").find("s.toml, line 2: found text that is not TOML at column ") ==
        0);
  CHECK(error_line("\nmode = \xC3\xA9t\xC3\xA9\n")
            .find("s.toml, line 2: found text that is not TOML at column ") == 0);
}

TEST_CASE("text outside ASCII is welcome in quotes and comments, also behind a byte order mark") {
  CHECK(error_line("\xEF\xBB\xBF# gr\xC3\xBC\xC3\x9F\n\"\xCA\x8A\" = \"\xC3\xA9t\xC3\xA9\"\n",
                   [](TomlTable& t) { CHECK(t.text("\xCA\x8A") == "\xC3\xA9t\xC3\xA9"); })
            .empty());
}

TEST_CASE("what a file says cannot steer a terminal") {
  const std::string line = error_line("a = \"\\u001b[2J\"\n", [](TomlTable& t) { t.number("a", {0, 1}); });
  CHECK(line == "s.toml, line 1, a: found the string \"\\x1b[2J\", expected a number from 0 to 1");
}

TEST_CASE("a message stays short, however long the key or the string") {
  CHECK(error_line(repeated("k", 1000) + " = 1\n") ==
        "s.toml, line 1, \"" + repeated("k", 80) + "...\": found an unknown key, expected none");
  // The 80th byte would cut the 27th of these letters of three bytes in two.
  CHECK(error_line("a = \"" + repeated("\xE2\x82\xAC", 100) + "\"\n", [](TomlTable& t) { t.boolean("a"); }) ==
        "s.toml, line 1, a: found the string \"" + repeated("\xE2\x82\xAC", 26) +
            "...\", expected true or false");
}

TEST_CASE("nesting without end is an error and does not overflow the stack") {
  CHECK(error_line("a = " + repeated("[", 1'000'000)).find("s.toml, line 1: found text that is not TOML") ==
        0);
  CHECK(error_line("a = " + repeated("{a=", 1'000'000)).find("s.toml, line 1: found text that is not TOML") ==
        0);
  const std::string long_key = "found a key of more than 16 parts, expected no more";
  CHECK(error_line("x = 1\n[" + repeated("a.", 3'000'000) + "a]\n") == "s.toml, line 2: " + long_key);
  CHECK(error_line("a" + repeated(" . \"b c\"", 1'000'000) + " = 1\n") == "s.toml, line 1: " + long_key);
  CHECK(error_line("x = '''\n\n'''\ny = {" + repeated("a.", 20) + "a = 1}\n") ==
        "s.toml, line 4: " + long_key);
  // The deepest text that is let through: inline tables inside each other, each by a key of 16 parts.
  const std::string step = "{" + repeated("a.", 15) + "a=";
  const std::string deepest = error_line("a=" + repeated(step, 31) + "1" + repeated("}", 31) + "\n");
  CHECK(deepest == "s.toml, line 1, a: found an unknown key, expected none");
}

TEST_CASE("dots in strings, numbers and comments are no parts of keys") {
  CHECK_FALSE(obstacle_line("a = \"" + repeated(".", 50) + "\"\n", 16));
  CHECK_FALSE(obstacle_line("a = '" + repeated(".", 50) + "' # " + repeated(".", 50) + "\n", 16));
  CHECK_FALSE(obstacle_line("a = [" + repeated("1.5, ", 50) + "]\n", 16));
  CHECK_FALSE(obstacle_line(
      "a = \"\"\"\n" + repeated(".", 50) + "\\\"\"\" x" + repeated(".", 50) + "\"\"\"\"\n", 16));
  CHECK(obstacle_line("a = \"\"\"\n\n\"\"\"\"\"\n" + repeated("a.", 50) + "a = 1\n", 16) == 4);
  CHECK(obstacle_line("a = \"\\\"\" # \"\n" + repeated("a.", 50) + "a = 1\n", 16) == 2);
  CHECK_FALSE(obstacle_line(repeated("a.", 15) + "a = 1\n", 16));
  CHECK(obstacle_line(repeated("a.", 16) + "a = 1\n", 16) == 1);
}

TEST_CASE("a file too large, absent or no file is refused") {
  CHECK(error_line(std::string(16'000'001, '\n')) ==
        "s.toml: found more than 16 MB, expected a TOML file of at most that");
  CHECK(error_line(std::string(16'000'000, '\n')).empty());
  const auto absent = TomlDocument::read("no_such_folder/s.toml");
  REQUIRE_FALSE(absent);
  CHECK(to_line(absent.error()) == "no_such_folder/s.toml: found no such file, expected a TOML file");
  const auto folder = TomlDocument::read("/");
  REQUIRE_FALSE(folder);
  CHECK(to_line(folder.error()) == "/: found a folder, expected a TOML file");
}

}  // namespace
}  // namespace evenfield
