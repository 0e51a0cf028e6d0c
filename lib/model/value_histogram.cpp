#include "model/value_histogram.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

namespace evenfield {
namespace {

constexpr int kMostBins = 256;
constexpr int kMostCounts = 100000;

}  // namespace

int ValueBins::bin_of(double value) const {
  // Of positive numbers conversion is floor, and quicker.
  return static_cast<int>(std::clamp((value - first) / width + 0.5, 0.0, count - 0.5));
}

ValueBins bins_of_means(double lowest, double highest, int frames) {
  assert(lowest <= highest && frames > 0);
  // Whole in exact arithmetic; the quotients of whole numbers below are exact, whatever their size.
  const double multiples = std::round(frames * (highest - lowest));
  const double together = std::floor(multiples / kMostBins) + 1;
  ValueBins bins;
  bins.width = together / frames;
  bins.first = lowest + (together - 1) / (2.0 * frames);
  bins.count = static_cast<int>(std::floor(multiples / together)) + 1;
  return bins;
}

ValueBins bins_of_range(double lowest, double highest) {
  assert(lowest <= highest);
  const double width = (highest - lowest) / kMostBins;
  if (!(width > 0)) return {lowest, 1, 1};
  return {lowest + width / 2, width, kMostBins};
}

std::vector<std::int64_t> count_values(std::span<const float> values, const ValueBins& bins) {
  std::vector<std::int64_t> counts(static_cast<std::size_t>(bins.count));
  for (const float value : values)
    ++counts[static_cast<std::size_t>(bins.bin_of(static_cast<double>(value)))];
  return counts;
}

std::vector<std::int64_t> count_deviations(std::span<const float> values, double mean, double step) {
  assert(step > 0);
  std::vector<std::int64_t> counts(1);
  for (const float value : values) {
    const double deviation = std::abs(static_cast<double>(value) - mean);
    auto steps = static_cast<std::int32_t>(std::min(deviation / step, kMostCounts - 1.0));
    // The quotient is rounded, the rule is not.
    if (steps * step > deviation)
      --steps;
    else if ((steps + 1) * step <= deviation && steps < kMostCounts - 1)
      ++steps;
    const auto at = static_cast<std::size_t>(steps);
    if (at >= counts.size()) counts.resize(at + 1);
    ++counts[at];
  }
  for (std::size_t k = counts.size() - 1; k-- > 0;) counts[k] += counts[k + 1];
  return counts;
}

double normal_count(double pixels, double bin_width, double value, double mean, double standard_deviation) {
  const double z = (value - mean) / standard_deviation;
  return pixels * bin_width / (std::sqrt(2 * std::numbers::pi) * standard_deviation) * std::exp(-z * z / 2);
}

}  // namespace evenfield
