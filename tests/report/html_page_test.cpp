#include "report/html_page.h"

#include <doctest/doctest.h>

#include <string>
#include <string_view>

#include "report/made_up_result.h"

using namespace evenfield;

namespace {

std::set<std::string> keys_of_template() {
  std::set<std::string> keys;
  const std::string_view text = html_template();
  for (std::size_t at = 0; (at = text.find("{{", at)) != std::string_view::npos;) {
    const std::size_t begin = text.find_first_not_of("{#^/", at), end = text.find('}', begin);
    keys.emplace(text.substr(begin, end - begin));
    at = end;
  }
  return keys;
}

std::size_t count(const std::string& text, const std::string& part) {
  std::size_t found = 0;
  for (std::size_t at = 0; (at = text.find(part, at)) != std::string::npos; at += part.size()) ++found;
  return found;
}

}  // namespace

TEST_CASE("every tag of the template is supplied with data") {
  // A result with everything opens every section, so each tag is looked up; html_page fails if one has no
  // data.
  const auto page = html_page(made_up_result({3, 2}), {{"response.svg", "<svg/>"}}, "a message");
  REQUIRE_MESSAGE(page, (page ? "" : to_line(page.error())));
  CHECK(page->keys == keys_of_template());
  CHECK(page->keys.size() > 40);
  CHECK(page->html.find("{{") == std::string::npos);
}

TEST_CASE("an empty result gives a page that says so") {
  const auto page = html_page({}, {}, "");
  REQUIRE(page);
  CHECK(page->html.find("No quantity could be determined") != std::string::npos);
  CHECK(page->html.find("This report has no pictures") != std::string::npos);
  CHECK(page->html.find("Read this first") == std::string::npos);
}

TEST_CASE("numbers carry their uncertainty, unit and interval, and what is missing says why") {
  const auto page = html_page(made_up_result(), {}, "");
  REQUIRE(page);
  for (const char* part :
       {"0.4604 ± 0.0021\u00A0DN/e⁻", "0.4562 to 0.4646", "(2.18 ± 0.31) × 10⁻⁵\u00A0e⁻/s", "not determined",
        "needs dark series of two exposures", "Whole frame, 512 × 1024 pixels"})
    CHECK_MESSAGE(page->html.find(part) != std::string::npos, part);
}

TEST_CASE("grave findings stand before the numbers and facts after the pictures") {
  const auto page = html_page(made_up_result(), {}, "");
  REQUIRE(page);
  const auto place = [&](const char* part) {
    const std::size_t at = page->html.find(part);
    REQUIRE_MESSAGE(at != std::string::npos, part);
    return at;
  };
  CHECK(place("problem: too few levels") < place("caution: light drifts"));
  CHECK(place("caution: light drifts") < place("id=\"numbers\""));
  CHECK(place("id=\"pictures\"") < place("<code>bit-depth-inferred"));
}

TEST_CASE("hostile names show as text") {
  const std::string hostile =
      "<script>alert(1)</script>\"'><img src=x onerror=y>{{title}}&\x1b[2J\xff\xc2\x85";
  Characterization result = made_up_result({2, 2});
  result.program_version = result.created = result.session.file = hostile;
  result.acquired = hostile;
  result.session.camera = {{hostile, hostile}, {"label", hostile}};
  for (auto& r : result.regions) r.name = hostile;
  for (auto& c : result.curves) c.region = hostile;
  for (auto& q : result.quantities) q.region = q.method = q.note = hostile;
  result.quantities[0].name = hostile;
  result.quantities[0].condition = {{hostile, 1}};
  for (auto& s : result.series) s.region = hostile, s.files = {hostile}, s.used_in = {hostile};
  for (auto& f : result.findings) f.code = f.message = hostile, f.quantities = {hostile};
  for (auto& f : result.frames) f.file = f.fingerprint = hostile;
  const auto page = html_page(result, {{"response.svg", "<svg/>"}}, hostile);
  REQUIRE(page);
  CHECK(page->html.find("<script") == std::string::npos);
  CHECK(page->html.find("onerror=y>") == std::string::npos);
  CHECK(count(page->html, "<img ") == 1);
  CHECK(page->html.find("&lt;script&gt;") != std::string::npos);
  CHECK(page->html.find("\\x1b[2J\\xff\\xc2\\x85") != std::string::npos);
  for (const char c : page->html) REQUIRE((static_cast<unsigned char>(c) >= 0x20 || c == '\n'));
}

TEST_CASE("the page needs no network and no script") {
  const auto page = html_page(made_up_result({3, 2}), {{"response.svg", "<svg/>"}}, "");
  REQUIRE(page);
  CHECK(page->html.find("http:") == std::string::npos);
  CHECK(page->html.find("https:") == std::string::npos);
  CHECK(page->html.find("<script") == std::string::npos);
  CHECK(page->html.find("<link") == std::string::npos);
  // "<svg/>" in base 64 after RFC 4648: 6 bytes, two groups, no padding.
  CHECK(page->html.find("data:image/svg+xml;base64,PHN2Zy8+\"") != std::string::npos);
  CHECK(page->html.find("<html lang=\"en\">") != std::string::npos);
  CHECK(count(page->html, "<img ") == count(page->html, "alt=\"Plot: "));
  CHECK(count(page->html, "<th ") == count(page->html, "<th scope="));
}

TEST_CASE("a session of many frames keeps its page in proportion") {
  Characterization result = made_up_result({200, 1});
  for (int i = 0; i < 20000; ++i)
    result.frames.push_back(
        {"frame_" + std::to_string(i) + ".tif", 1, SeriesKind::flat, std::string(32, 'a')});
  const auto page = html_page(result, {}, "");
  REQUIRE(page);
  CHECK(count(page->html, "<td><code>") == result.frames.size());
  CHECK(page->html.size() < 300 * result.frames.size());
}
