#include "analyse/dark_match.h"

#include <doctest/doctest.h>

using namespace evenfield;

namespace {

SeriesInput series(SeriesKind kind,
                   std::optional<double> exposure,
                   double mean,
                   double variance,
                   std::optional<double> temperature = {}) {
  SeriesInput out;
  out.conditions.kind = kind;
  out.conditions.exposure_s = exposure;
  out.conditions.temperature_c = temperature;
  RegionSummary summary;
  summary.frames = 4;
  summary.pixels = 1000;
  summary.mean = mean;
  summary.variance = variance;
  summary.dof = 3000;
  out.regions.push_back(summary);
  return out;
}

double sum(const SeriesWeights& weights, const AnalysisInput& input, double RegionSummary::*field) {
  double out = 0;
  for (const auto& [s, weight] : weights) out += weight * input.series[s].regions[0].*field;
  return out;
}

Conditions flat_at(std::optional<double> exposure) {
  Conditions c;
  c.exposure_s = exposure;
  return c;
}

}  // namespace

TEST_CASE("darks of several exposures give mean and variance at the flat's own, on a straight line") {
  AnalysisInput input;
  // mean 100 + 3 t, variance 4 + 1.5 t
  for (const double t : {0.0, 1.0, 4.0})
    input.series.push_back(series(SeriesKind::dark, t, 100 + 3 * t, 4 + 1.5 * t));
  const MatchedDark dark = match_dark(input, 0, flat_at(2.0));
  CHECK(dark.line);
  CHECK(!dark.extrapolated);
  CHECK(sum(dark.mean, input, &RegionSummary::mean) == doctest::Approx(106).epsilon(1e-12));
  double variance = 0;
  for (const auto& [s, weight] : dark.variance) variance += weight * *input.series[s].regions[0].variance;
  CHECK(variance == doctest::Approx(7).epsilon(1e-12));
  CHECK(match_dark(input, 0, flat_at(5.0)).extrapolated);
  CHECK(sum(match_dark(input, 0, flat_at(5.0)).mean, input, &RegionSummary::mean) ==
        doctest::Approx(115).epsilon(1e-12));
}

TEST_CASE("one dark exposure is used as it is, and how far it lies from the flat's is kept") {
  AnalysisInput input;
  input.series.push_back(series(SeriesKind::bias, 0.0, 100, 4));
  const MatchedDark dark = match_dark(input, 0, flat_at(0.5));
  CHECK(!dark.line);
  CHECK(dark.exposure_difference_s == 0.5);
  REQUIRE(dark.mean.size() == 1);
  CHECK(dark.mean[0].second == 1.0);
  CHECK(match_dark(input, 0, flat_at(std::nullopt)).exposure_unknown);
}

TEST_CASE("a dark more than a kelvin away does not match") {
  AnalysisInput input;
  input.series.push_back(series(SeriesKind::dark, 1.0, 100, 4, -10.0));
  input.series.push_back(series(SeriesKind::dark, 1.0, 200, 9, 20.0));
  Conditions flat = flat_at(1.0);
  flat.temperature_c = -9.5;
  const MatchedDark dark = match_dark(input, 0, flat);
  REQUIRE(dark.mean.size() == 1);
  CHECK(dark.mean[0].first == 0);
  flat.temperature_c = 0.0;
  CHECK(match_dark(input, 0, flat).mean.empty());
}
