#include "analyse/quantities.h"

#include <array>
#include <cmath>
#include <limits>

#include "model/gum.h"
#include "model/student.h"

namespace evenfield {
namespace {

constexpr double kCoverage = 0.95;

}  // namespace

Quantity known(std::string name,
               const std::string& region,
               const Estimate& estimate,
               std::string method,
               std::string note) {
  Quantity q;
  q.name = std::move(name);
  q.region = region;
  q.value = estimate.value;
  q.statistical_uncertainty = estimate.statistical_uncertainty;
  q.common_uncertainty = estimate.common_uncertainty;
  q.standard_uncertainty = std::hypot(estimate.statistical_uncertainty, estimate.common_uncertainty);
  if (estimate.degrees_of_freedom && estimate.statistical_uncertainty > 0) {
    constexpr double kMany = std::numeric_limits<double>::infinity();
    const std::array parts{Contribution{estimate.statistical_uncertainty, *estimate.degrees_of_freedom},
                           Contribution{estimate.common_uncertainty, kMany}};
    const double effective = effective_degrees_of_freedom(parts);
    constexpr double kAsGoodAsMany = 1e6;  // Student's t differs from the normal distribution by 1e-6 there
    if (effective < kAsGoodAsMany) q.degrees_of_freedom = effective;
  }
  const double half = coverage_factor(kCoverage, q.degrees_of_freedom) * *q.standard_uncertainty;
  q.low95 = estimate.value - half;
  q.high95 = estimate.value + half;
  q.method = std::move(method);
  q.note = std::move(note);
  return q;
}

Quantity unknown(std::string name, const std::string& region, std::string reason) {
  Quantity q;
  q.name = std::move(name);
  q.region = region;
  q.note = std::move(reason);
  return q;
}

Quantity root_of_square(std::string name,
                        const std::string& region,
                        double square,
                        double square_uncertainty,
                        double divisor,
                        double divisor_relative_uncertainty,
                        std::string method,
                        std::string note) {
  Quantity q;
  q.name = std::move(name);
  q.region = region;
  q.method = std::move(method);
  if (!(square_uncertainty > 0)) {
    q.note = "the frames show no noise, so nothing is known of the uncertainty";
    return q;
  }
  if (square <= 0) {
    const double one_sided = normal_quantile(kCoverage);
    // Counted from zero: a square that came out far below it by chance must not promise that there is no
    // pattern at all.
    q.high95 = std::sqrt(one_sided * square_uncertainty) / divisor;
    q.note = "not resolved: less than the temporal noise can hide; the upper limit is one-sided";
    if (!note.empty()) q.note += "; " + note;
    return q;
  }
  const double k = coverage_factor(kCoverage, std::nullopt);
  const double value = std::sqrt(square) / divisor;
  const double low = std::sqrt(std::max(0.0, square - k * square_uncertainty)) / divisor;
  const double high = std::sqrt(square + k * square_uncertainty) / divisor;
  // Half the interval: u(s^2) / (2 s) far from zero, where that quotient would grow without end near it.
  const double own = (high - low) / (2 * k);
  const double scale = value * divisor_relative_uncertainty;
  q.value = value;
  q.statistical_uncertainty = std::hypot(own, scale);
  q.standard_uncertainty = q.statistical_uncertainty;
  q.common_uncertainty = 0.0;
  q.low95 = std::max(0.0, value - std::hypot(value - low, k * scale));
  q.high95 = value + std::hypot(high - value, k * scale);
  q.note = std::move(note);
  return q;
}

}  // namespace evenfield
