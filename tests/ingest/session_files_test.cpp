#include "ingest/session_files.h"

#include <doctest/doctest.h>
#include <sys/stat.h>

#include <string>

#include "session_folder.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

/// The lists of `files` in `text`, one series each, looked up from `folder`/session.
Result<SeriesFiles> find(const SessionFolder& folder, const std::string& text) {
  const fs::path file = folder.path() / "session" / "s.toml";
  auto document = TomlDocument::parse(text, file);
  REQUIRE(document);
  std::vector<SeriesFileNames> lists;
  for (TomlTable& table : document->root().tables("series")) {
    auto names = table.texts("files");
    REQUIRE(names);
    lists.push_back({table, *names});
  }
  return find_series_files(file, lists);
}

std::vector<std::string> shown(const SeriesFiles& files) {
  std::vector<std::string> out;
  for (const SessionFile& file : files.files) {
    CHECK(fs::exists(file.path));
    out.push_back(file.shown);
  }
  return out;
}

std::string error_line(const SessionFolder& folder, const std::string& text) {
  const auto found = find(folder, text);
  if (found) return "";
  const std::string line = to_line(found.error());
  const std::string prefix = (folder.path() / "session/").string();
  REQUIRE(line.find(prefix) == 0);
  return line.substr(prefix.size());
}

class Frames : public SessionFolder {
 public:
  Frames() {
    for (const char* name : {"session/a1.tif", "session/a2.tif", "session/sub/b.tif", "outside/c.tif"})
      write(name, "x");
  }
};

using Names = std::vector<std::string>;

TEST_CASE("files are shown relative to the session file inside its folder, and as written outside") {
  const Frames folder;
  const std::string absolute_inside = (folder.path() / "session/sub/b.tif").string();
  const auto found = find(folder, "[[series]]\nfiles = [\"./a2.tif\", \"../outside/*.tif\", '" +
                                      absolute_inside + "', \"../session/a1.tif\"]\n");
  REQUIRE(found);
  CHECK(shown(*found) == Names{"a2.tif", "../outside/c.tif", "sub/b.tif", "a1.tif"});
  const std::string absolute_outside = (folder.path() / "outside/c.tif").string();
  const auto outside = find(folder, "[[series]]\nfiles = ['" + absolute_outside + "']\n");
  REQUIRE(outside);
  CHECK(shown(*outside) == Names{absolute_outside});
}

TEST_CASE("a file that a series names twice counts once, through a symbolic link too") {
  const Frames folder;
  fs::create_symlink(folder.path() / "session/a1.tif", folder.path() / "session/link.tif");
  const auto found =
      find(folder, "[[series]]\nfiles = [\"a2.tif\", \"*.tif\", \"./a1.tif\", \"link.tif\"]\n");
  REQUIRE(found);
  CHECK(shown(*found) == Names{"a2.tif", "a1.tif"});
  CHECK(found->of_series == std::vector<std::vector<int>>{{0, 1}});
}

TEST_CASE("a file in two series is an error") {
  const Frames folder;
  CHECK(
      error_line(folder,
                 "[[series]]\nfiles = [\"a1.tif\"]\n[[series]]\nfiles = [\n\"sub/b.tif\",\n\"a*.tif\"]\n") ==
      "s.toml, line 6, series[2].files[2]: found \"a1.tif\", which series[1] has too, expected each file in "
      "one series");
}

TEST_CASE("a missing file and a glob that matches nothing name the line and the path") {
  const Frames folder;
  CHECK(error_line(folder, "[[series]]\nfiles = [\"a1.tif\",\n \"a3.tif\"]\n") ==
        "s.toml, line 3, series[1].files[2]: found no file \"a3.tif\", expected one");
  CHECK(
      error_line(folder, "[[series]]\nfiles = [\"flat_*.tif\"]\n") ==
      "s.toml, line 2, series[1].files[1]: found no file that matches \"flat_*.tif\", expected at least one");
  fs::create_symlink("nowhere.tif", folder.path() / "session/a3.tif");
  CHECK(error_line(folder, "[[series]]\nfiles = [\"a*.tif\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found no file \"a3.tif\", expected one");
}

TEST_CASE("what is no regular file is refused without being opened") {
  const Frames folder;
  CHECK(error_line(folder, "[[series]]\nfiles = [\"sub\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found the folder \"sub\", expected a file or a glob");
  CHECK(error_line(folder, "[[series]]\nfiles = [\"a1.tif/x\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found no file \"a1.tif/x\", expected one");
  REQUIRE(mkfifo((folder.path() / "session/pipe.tif").c_str(), 0600) == 0);
  CHECK(error_line(folder, "[[series]]\nfiles = [\"p*.tif\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found that \"pipe.tif\" is a device, pipe or socket, expected a "
        "file");
  CHECK(error_line(folder, "[[series]]\nfiles = [\"\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found an empty string, expected a path or a glob");
  CHECK(error_line(folder, "[[series]]\nfiles = [\"a1.tif\\u0000b\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found a NUL character, expected a path or a glob");
}

TEST_CASE("a name with glob characters that exists is taken as it is") {
  const Frames folder;
  folder.write("session/a[1].tif", "x");
  const auto found = find(folder, "[[series]]\nfiles = [\"a[1].tif\"]\n");
  REQUIRE(found);
  CHECK(shown(*found) == Names{"a[1].tif"});
  const auto both = find(folder, "[[series]]\nfiles = [\"a[12].tif\"]\n");
  REQUIRE(both);
  CHECK(shown(*both) == Names{"a1.tif", "a2.tif"});
}

TEST_CASE("neither a tilde nor a variable means anything") {
  const Frames folder;
  CHECK(error_line(folder, "[[series]]\nfiles = [\"~/x.tif\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found no file \"~/x.tif\", expected one");
  CHECK(error_line(folder, "[[series]]\nfiles = [\"$HOME/*.tif\"]\n") ==
        "s.toml, line 2, series[1].files[1]: found no file that matches \"$HOME/*.tif\", expected at least "
        "one");
}

TEST_CASE("names that could steer a terminal are shown escaped") {
  const Frames folder;
  folder.write("session/e\x1b[2J.tif", "x");
  folder.write("session/e\xFF.tif", "x");
  const auto found = find(folder, "[[series]]\nfiles = [\"e*.tif\"]\n");
  REQUIRE(found);
  CHECK(shown(*found) == Names{"e\\x1b[2J.tif", "e\\xff.tif"});
}

}  // namespace
}  // namespace evenfield
