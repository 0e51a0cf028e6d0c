#include "result/finding_table.h"

#include <doctest/doctest.h>

#include <set>
#include <string>

using namespace evenfield;

// The codes that the documentation promises, in its order.
constexpr const char* kPromised[] = {"duplicate-frames",
                                     "light-drift",
                                     "light-banding",
                                     "lamp-limited",
                                     "exposure-mismatch",
                                     "outlier-frame",
                                     "saturated",
                                     "clipped-dark",
                                     "coarse-quantization",
                                     "missing-codes",
                                     "correlated-noise",
                                     "row-noise",
                                     "uneven-illumination",
                                     "unmatched-dark",
                                     "zero-noise",
                                     "too-few-levels",
                                     "too-few-frames",
                                     "converter-limited",
                                     "nonlinear",
                                     "gain-switch",
                                     "light-leak",
                                     "mixed-temperature",
                                     "offset-regulated",
                                     "in-camera-correction",
                                     "mosaic-suspected",
                                     "bit-depth-inferred",
                                     "wavelength-range",
                                     "impossible-efficiency",
                                     "checksum"};

TEST_CASE("the table holds exactly the promised findings in their order") {
  REQUIRE(finding_table().size() == std::size(kPromised));
  for (std::size_t i = 0; i < std::size(kPromised); ++i) CHECK(finding_table()[i].code == kPromised[i]);
}

TEST_CASE("every finding says in its own sentence what it means and what to do") {
  std::set<std::string_view> sentences;
  for (const FindingInfo& info : finding_table()) {
    CAPTURE(info.code);
    CHECK(find_finding(info.code) == &info);
    CHECK(info.sentence.ends_with('.'));
    CHECK(info.advice.ends_with('.'));
    CHECK(!info.title.empty());
    CHECK(sentences.insert(info.sentence).second);
  }
  CHECK(find_finding("no-such-finding") == nullptr);
}
