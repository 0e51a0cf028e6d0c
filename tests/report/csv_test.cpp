#include "report/csv.h"

#include <doctest/doctest.h>

#include <algorithm>

#include "report/made_up_result.h"

using namespace evenfield;

TEST_CASE("absent values are empty cells and numbers are in their shortest exact form") {
  Characterization result;
  Quantity q;
  q.name = "read_noise_e";
  q.region = "whole";
  q.condition = {{"exposure_s", 0.1}, {"temperature_c", -10}};
  q.value = 0.1 + 0.2;  // 0.30000000000000004, the nearest double to that sum
  q.note = "one, \"two\"";
  result.quantities = {q};
  const std::string text = quantities_csv(result);
  CHECK(text.substr(text.find('\n') + 1) ==
        "read_noise_e,sigma_d,e-,whole,\"exposure_s=0.1;temperature_c=-10\",0.30000000000000004,,,,,,,,"
        "\"one, \"\"two\"\"\"\n");
}

TEST_CASE("text that begins like a formula does not become one, and a negative number stays a number") {
  Characterization result;
  SeriesResult s;
  s.conditions.temperature_c = -10;
  s.region = "=HYPERLINK(1)";
  s.mean_dn = -0.5;
  s.files = {"+1.tif", "line\nbreak.tif"};
  result.series = {s};
  const std::string text = series_csv(result);
  CHECK(text.substr(text.find('\n') + 1) ==
        "0,flat,,1,-10,'=HYPERLINK(1),0,0,-0.5,0,,,0,,0,,\"'+1.tif;line\\x0abreak.tif\"\n");
  result.findings = {{"checksum", Severity::info, "@x", {1, 2}, {"-a"}, {{"seen_dn", 3}}},
                     {"checksum", Severity::info, "\t=1", {}, {}, {}}};
  const std::string findings = findings_csv(result);
  CHECK(findings ==
        "code,severity,message,series,quantities,evidence\n"
        "checksum,info,'@x,\"1;2\",'-a,seen_dn=3\nchecksum,info,\\x09=1,,,\n");
}

TEST_CASE("every row has as many cells as the header") {
  const Characterization result = made_up_result({14, 4});
  for (const std::string& text : {quantities_csv(result), series_csv(result), findings_csv(result)}) {
    std::size_t expected = 0, cells = 1;
    bool quoted = false;
    for (const char c : text) {
      if (c == '"') quoted = !quoted;
      if (quoted) continue;
      if (c == ',') ++cells;
      if (c != '\n') continue;
      if (expected == 0) expected = cells;
      REQUIRE(cells == expected);
      cells = 1;
    }
    CHECK(text.back() == '\n');
  }
}
