#include "ingest/glob.h"

#include <doctest/doctest.h>

#include <string>

#include "session_folder.h"

namespace evenfield {
namespace {

TEST_CASE("one component matches by the rules of the header") {
  struct Row {
    const char* pattern;
    const char* name;
    bool matches;
  };
  // Each row is a sentence of glob.h.
  for (const Row& row : {Row{"flat_*.tif", "flat_010ms.tif", true},
                         Row{"flat_*.tif", "flat_.tif", true},
                         Row{"flat_*.tif", "flat_010ms.tiff", false},
                         Row{"*a*b", "xaxxbab", true},
                         Row{"*a*b", "xaxxba", false},
                         Row{"flat?.tif", "flat7.tif", true},
                         Row{"flat?.tif", "flat.tif", false},
                         Row{"flat?.tif", "flat\xC3\xA9.tif", true},  // one character, two bytes
                         Row{"flat?.tif", "flat\xFF.tif", true},      // a byte that is no UTF-8
                         Row{"[\xC3\xA0-\xC3\xBC]", "\xC3\xA9", true},
                         Row{"[a-c1]x", "bx", true},
                         Row{"[a-c1]x", "1x", true},
                         Row{"[a-c1]x", "dx", false},
                         Row{"[!a-c]x", "dx", true},
                         Row{"[^a-c]x", "bx", false},
                         Row{"[]a]", "]", true},
                         Row{"[a-]", "-", true},
                         Row{"a[*]b", "a*b", true},
                         Row{"a[*]b", "axb", false},
                         Row{"a[b", "a[b", true},
                         Row{"*", ".hidden", false},
                         Row{"?hidden", ".hidden", false},
                         Row{".h*", ".hidden", true},
                         Row{"**", "abc", true},
                         Row{"", "", true},
                         Row{"*", "", true}}) {
    CAPTURE(row.pattern);
    CAPTURE(row.name);
    CHECK(glob_matches(row.pattern, row.name) == row.matches);
  }
}

TEST_CASE("many stars against a long name end at once") {
  std::string pattern;
  for (int i = 0; i < 60; ++i) pattern += "*a";
  CHECK_FALSE(glob_matches(pattern + "b", std::string(4000, 'a')));
}

TEST_CASE("files are found in byte order, through folders too, and folders are left out") {
  const SessionFolder folder;
  for (const char* name :
       {"b.tif", "a10.tif", "a2.tif", "B.tif", "run_2/x.tif", "run_1/x.tif", "run_1/y.fits", ".a.tif"})
    folder.write(name, "");
  std::filesystem::create_directory(folder.path() / "c.tif");
  const auto names = [&folder](const char* pattern) {
    auto found = expand_glob(folder.path(), pattern);
    REQUIRE(found);
    return *found;
  };
  using Paths = std::vector<std::filesystem::path>;
  CHECK(names("*.tif") == Paths{"B.tif", "a10.tif", "a2.tif", "b.tif"});
  CHECK(names("run_?/*.tif") == Paths{"run_1/x.tif", "run_2/x.tif"});
  CHECK(names("run_1/../run_2/*") == Paths{"run_1/../run_2/x.tif"});
  CHECK(names("*/x.tif") == Paths{"run_1/x.tif", "run_2/x.tif"});
  CHECK(names("none/*.tif").empty());
  CHECK(names("b.tif/*").empty());
  CHECK(names((folder.path() / "run_1/*.fits").c_str()) == Paths{folder.path() / "run_1/y.fits"});
}

}  // namespace
}  // namespace evenfield
