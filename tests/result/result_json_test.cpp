#include "result/result_json.h"

#include <doctest/doctest.h>
#include <unistd.h>

#include <bit>
#include <cmath>
#include <fstream>
#include <limits>
#include <random>

using namespace evenfield;

namespace {

/// Random values of every field that result.json carries.
class Maker {
  std::mt19937_64 random_;

 public:
  explicit Maker(std::uint64_t number) : random_(number) {}
  int count(int most) { return static_cast<int>(random_() % static_cast<unsigned>(most + 1)); }
  bool coin() { return (random_() & 1U) != 0; }
  double real() {  // any finite bit pattern: subnormal, huge, negative zero
    for (;;)
      if (const double value = std::bit_cast<double>(random_()); std::isfinite(value))
        return coin() ? value : std::floor(std::fmod(value, 1e6));
  }
  std::optional<double> maybe() { return coin() ? std::optional(real()) : std::nullopt; }
  std::string text() {
    constexpr const char* kParts[] = {"a", "Z",  "0", " ", "\"", "\\", "/", "é",
                                      "µ", "漢", "😀", "<", "'",  ":",  "{", "]"};
    std::string out;
    for (int i = count(12); i > 0; --i) out += kParts[random_() % std::size(kParts)];
    return out;
  }
  std::vector<std::string> texts() {
    std::vector<std::string> out(static_cast<std::size_t>(count(3)));
    for (auto& t : out) t = text();
    return out;
  }
  std::vector<std::pair<std::string, double>> named() {
    std::vector<std::pair<std::string, double>> out;
    for (int i = count(3); i > 0; --i) out.emplace_back("key" + std::to_string(i) + text(), real());
    return out;
  }
  std::vector<Setting> settings() {
    std::vector<Setting> out;
    for (int i = count(4); i > 0; --i) {
      const std::string key = "key" + std::to_string(i) + text();
      switch (count(3)) {
        case 0:
          out.emplace_back(key, text());
          break;
        case 1:
          out.emplace_back(key, real());
          break;
        case 2:
          out.emplace_back(key, static_cast<std::int64_t>(random_()));
          break;
        default:
          out.emplace_back(key, coin());
      }
    }
    return out;
  }
  SeriesKind kind() {
    constexpr SeriesKind kKinds[] = {SeriesKind::flat, SeriesKind::dark, SeriesKind::bias};
    return kKinds[count(2)];
  }

  Characterization characterization() {
    Characterization c;
    c.program_version = text();
    c.created = text();
    if (coin()) c.acquired = text();
    c.session = {text(), settings(), settings(), settings()};
    for (int i = count(3); i > 0; --i)
      c.regions.push_back({text(), {count(9), count(9), count(9), count(9)}});
    for (int i = count(5); i > 0; --i)
      c.quantities.push_back({"read_noise_e", text(), named(), maybe(), maybe(), maybe(), maybe(), maybe(),
                              maybe(), maybe(), text(), text()});
    const int size = count(3);
    for (int i = 0; i < size; ++i) {
      c.correlations.names.push_back(text());
      auto& row = c.correlations.matrix.emplace_back();
      for (int k = 0; k < size; ++k) row.push_back(real());
    }
    for (int i = count(4); i > 0; --i)
      c.series.push_back({{kind(), maybe(), real(), maybe(), {}, {}},
                          text(),
                          count(99),
                          static_cast<std::int64_t>(random_() >> 1U),
                          real(),
                          real(),
                          maybe(),
                          maybe(),
                          real(),
                          maybe(),
                          count(99),
                          texts(),
                          texts()});
    for (int i = count(3); i > 0; --i)
      c.findings.push_back({"code" + text(),
                            coin() ? Severity::problem : Severity::info,
                            text(),
                            {count(5), count(5)},
                            texts(),
                            named()});
    for (int i = count(4); i > 0; --i) c.frames.push_back({text(), count(9), kind(), text()});
    return c;
  }
};

Error error_of(std::string_view text) {
  const auto result = from_json(text, "r.json");
  REQUIRE_FALSE(result);
  return result.error();
}

std::string with_schema(const std::string& rest) { return R"({"schema":"evenfield.result/1",)" + rest + "}"; }

}  // namespace

TEST_CASE("what is written reads back, and writes the same bytes again") {
  for (std::uint64_t number = 0; number < 300; ++number) {
    CAPTURE(number);
    const Characterization before = Maker(number).characterization();
    const auto text = to_json(before);
    REQUIRE(text);
    const auto after = from_json(*text, "r.json");
    REQUIRE(after);
    CHECK(*to_json(*after) == *text);
    REQUIRE(after->quantities.size() == before.quantities.size());
    for (std::size_t i = 0; i < before.quantities.size(); ++i) {
      const Quantity &a = before.quantities[i], &b = after->quantities[i];
      REQUIRE(a.value.has_value() == b.value.has_value());
      if (a.value) CHECK(std::bit_cast<std::uint64_t>(*a.value) == std::bit_cast<std::uint64_t>(*b.value));
      CHECK(a.condition == b.condition);
      CHECK(a.low95 == b.low95);
      CHECK(a.note == b.note);
    }
    CHECK(after->session.camera == before.session.camera);
    CHECK(after->acquired == before.acquired);
    CHECK(after->correlations.matrix == before.correlations.matrix);
    REQUIRE(after->series.size() == before.series.size());
    for (std::size_t i = 0; i < before.series.size(); ++i) {
      CHECK(after->series[i].conditions.kind == before.series[i].conditions.kind);
      CHECK(after->series[i].pixels == before.series[i].pixels);
      CHECK(after->series[i].files == before.series[i].files);
    }
  }
}

TEST_CASE("the bytes of a small result are these") {
  Characterization c;
  c.program_version = "0.1.0";
  c.created = "2026-11-24T10:00:00Z";
  c.session.file = "s.toml";
  c.session.camera = {{"bit_depth", std::int64_t{12}}, {"pixel_pitch_um", 6.0}};
  c.regions = {{"whole", {0, 0, 4, 2}}};
  Quantity q;
  q.name = "read_noise_e";
  q.region = "whole";
  q.condition = {{"exposure_s", 0.1}};
  q.value = 2.5;
  c.quantities = {q};
  c.findings = {
      {"checksum", Severity::caution, "two\nlines \xff", {0}, {"read_noise_e"}, {{"bad_count", 1}}}};
  CHECK(*to_json(c) ==
        R"({
  "schema": "evenfield.result/1",
  "program": {"name":"evenfield","version":"0.1.0"},
  "created": "2026-11-24T10:00:00Z",
  "acquired": null,
  "session": {"file":"s.toml","camera":{"bit_depth":12,"pixel_pitch_um":6.0},"light":{},"analysis":{}},
  "regions": [
    {"name":"whole","x":0,"y":0,"width":4,"height":2}
  ],
  "quantities": [
    {"name":"read_noise_e","symbol":"sigma_d","unit":"e-","region":"whole","condition":{"exposure_s":0.1},"value":2.5,"standard_uncertainty":null,"statistical_uncertainty":null,"common_uncertainty":null,"degrees_of_freedom":null,"low95":null,"high95":null,"method":"","note":""}
  ],
  "correlations": {"names":[],"matrix":[]},
  "series": [],
  "findings": [
    {"code":"checksum","severity":"caution","message":"two\\x0alines \\xff","series":[0],"quantities":["read_noise_e"],"evidence":{"bad_count":1.0}}
  ],
  "frames": []
}
)");
}

TEST_CASE("a number that is not finite is refused with its path instead of being written as null") {
  Characterization c;
  c.quantities.resize(2);
  c.quantities[1].value = std::numeric_limits<double>::quiet_NaN();
  auto text = to_json(c);
  REQUIRE_FALSE(text);
  CHECK(text.error().where.key == "quantities[1].value");
  CHECK(text.error().code == Errc::output);
  c.quantities[1].value = 1;
  c.series.resize(1);
  c.series[0].mean_dn = std::numeric_limits<double>::infinity();
  text = to_json(c);
  REQUIRE_FALSE(text);
  CHECK(text.error().where.key == "series[0].mean_dn");
}

TEST_CASE("a result with nothing but the schema is a result, and unknown keys are passed over") {
  const auto empty = from_json(R"({"schema":"evenfield.result/1"})", "r.json");
  REQUIRE(empty);
  CHECK(empty->quantities.empty());
  const auto more = from_json(
      with_schema(R"("new":{"a":[1,{"b":2}]},"quantities":[{"name":"read_noise_e","value":2,"newer":true}])"),
      "r.json");
  REQUIRE(more);
  CHECK(more->quantities.at(0).value == 2.0);
  CHECK(more->quantities.at(0).region == "whole");
  CHECK_FALSE(more->quantities.at(0).low95);
}

TEST_CASE("texts that a foreign result smuggles in come out harmless") {
  const auto result = from_json(with_schema(R"("created":"\u001b[2J\u0085x")"), "r.json");
  REQUIRE(result);
  CHECK(result->created == "\\x1b[2J\\xc2\\x85x");
}

TEST_CASE("what is no result is refused with file, place, found and expected") {
  struct Row {
    std::string text, line;
  };
  const Row rows[] = {
      {"", "r.json, line 1: found text that is not JSON, expected a result of this program"},
      {"{\n\"schema\": 1,\n,}",
       "r.json, line 3: found text that is not JSON, expected a result of this program"},
      {"[]", "r.json: found a list, expected an object"},
      {"{}", "r.json, schema: found nothing, expected a text"},
      {R"({"schema":7})", "r.json, schema: found a number, expected a text"},
      {R"({"schema":"evenfield.result/9"})",
       "r.json, schema: found \"evenfield.result/9\", expected \"evenfield.result/1\""},
      {with_schema(R"("quantities":{})"), "r.json, quantities: found an object, expected a list"},
      {with_schema(R"("quantities":[{"name":"a"},{"value":1}])"),
       "r.json, quantities[1].name: found nothing, expected a text"},
      {with_schema(R"("quantities":[{"name":"a","value":"1"}])"),
       "r.json, quantities[0].value: found a text, expected a number"},
      {with_schema(R"("quantities":[null])"), "r.json, quantities[0]: found null, expected a value"},
      {with_schema(R"("quantities":[3])"), "r.json, quantities[0]: found a number, expected an object"},
      {with_schema(R"("quantities":[{"name":"a","condition":{"t":null}}])"),
       "r.json, quantities[0].condition.t: found null, expected a number"},
      {with_schema(R"("series":[{"kind":"fog"}])"),
       "r.json, series[0].kind: found \"fog\", expected one of flat, dark, bias"},
      {with_schema(R"("series":[{"kind":"flat","frames":2.5}])"),
       "r.json, series[0].frames: found 2.5, expected a whole number in range"},
      {with_schema(R"("series":[{"kind":"flat","frames":4294967296}])"),
       "r.json, series[0].frames: found 4294967296, expected a whole number in range"},
      {with_schema(R"("series":[{"kind":"flat","pixels":18446744073709551615}])"),
       "r.json, series[0].pixels: found 18446744073709551615, expected a whole number in range"},
      {with_schema(R"("frames":[{"kind":"flat","file":["x"]}])"),
       "r.json, frames[0].file: found a list, expected a text"},
      {with_schema(R"("session":{"camera":{"a":[1]}})"),
       "r.json, session.camera.a: found a list, expected a text, a number or a boolean"},
      {with_schema(R"("correlations":{"names":["a","b"],"matrix":[[1,0]]})"),
       "r.json, correlations.matrix: found another shape, expected a row and a column for each of names"},
      {with_schema(R"("created":1e999)"),
       "r.json: found a number too large to represent, expected a finite one"},
      {with_schema("\"created\":\"\xff\""),
       "r.json, line 1: found text that is not JSON, expected a result of this program"},
  };
  for (const Row& row : rows) {
    CAPTURE(row.text);
    const Error error = error_of(row.text);
    CHECK(to_line(error) == row.line);
    CHECK(error.code == Errc::input);
  }
}

TEST_CASE("nesting without end is refused before it is parsed") {
  CHECK(to_line(error_of(std::string(5'000'000, '['))) ==
        "r.json: found deeper nesting, expected at most 16 levels of JSON");
  // Brackets inside a text are no nesting.
  CHECK(from_json(with_schema("\"created\":\"" + std::string(100, '[') + "\\\"[\""), "r.json"));
}

TEST_CASE("a file that is missing, a folder or too large is refused by name") {
  const std::filesystem::path folder =
      std::filesystem::temp_directory_path() / ("evenfield_result_" + std::to_string(::getpid()));
  std::filesystem::create_directories(folder);
  CHECK(to_line(read_result(folder / "no.json").error()).find("no.json: found no such file") !=
        std::string::npos);
  CHECK(to_line(read_result(folder).error()).find("found no regular file") != std::string::npos);
  std::ofstream(folder / "big.json") << "{";
  std::filesystem::resize_file(folder / "big.json", 65U << 20U);  // sparse: takes no room
  CHECK(to_line(read_result(folder / "big.json").error()).find("expected at most 67108864 in a result") !=
        std::string::npos);
  std::ofstream(folder / "good.json") << with_schema("\"created\":\"now\"");
  const auto good = read_result(folder / "good.json");
  REQUIRE(good);
  CHECK(good->created == "now");
  std::filesystem::remove_all(folder);
}
