#pragma once
/// What the files that word quantities share: conditions, products of uncertain numbers, and a list that
/// grows. Part of region_quantities.cpp and data_sheet_quantities.cpp.

#include <array>
#include <cmath>
#include <string>
#include <utility>
#include <vector>

#include "analyse/levels.h"
#include "analyse/nonuniformity.h"
#include "analyse/quantities.h"
#include "model/gum.h"

namespace evenfield {

using Condition = std::vector<std::pair<std::string, double>>;

inline Condition condition_of(const Conditions& c) {
  Condition out;
  if (c.exposure_s) out.emplace_back("exposure_s", *c.exposure_s);
  if (c.temperature_c) out.emplace_back("temperature_c", *c.temperature_c);
  if (c.em_gain) out.emplace_back("em_gain", *c.em_gain);
  if (c.control_v) out.emplace_back("control_v", *c.control_v);
  return out;
}

/// The condition of a number that rests on all levels: what they share.
inline Condition light_condition(const RegionLevels& levels) {
  Condition out;
  if (levels.levels().empty()) return out;
  Conditions shared = levels.input().series[levels.levels().front().series].conditions;
  shared.exposure_s.reset();
  return condition_of(shared);
}

/// value x factor, where both are uncertain and independent.
inline Estimate product(
    double value, double uncertainty, std::optional<double> dof, double factor, const Estimate& of_factor) {
  Estimate out;
  out.value = value * factor;
  const std::array parts{Contribution{std::abs(factor) * uncertainty, dof.value_or(1e300)},
                         Contribution{std::abs(value) * of_factor.statistical_uncertainty,
                                      of_factor.degrees_of_freedom.value_or(1e300)}};
  out.statistical_uncertainty = combined_uncertainty(parts);
  if (out.statistical_uncertainty > 0) out.degrees_of_freedom = effective_degrees_of_freedom(parts);
  if (out.degrees_of_freedom && !(*out.degrees_of_freedom < 1e6)) out.degrees_of_freedom.reset();
  return out;
}

/// 1/K with the relative uncertainty of K.
inline Estimate inverse(const Estimate& gain) {
  const double value = 1 / gain.value;
  return {value, value * gain.statistical_uncertainty / gain.value,
          value * gain.common_uncertainty / gain.value, gain.degrees_of_freedom};
}

class QuantityList {
 public:
  explicit QuantityList(const RegionLevels& levels)
      : levels_(levels), region_(levels.input().regions[levels.region()].name) {}

  Quantity& known(std::string name, const Estimate& estimate, std::string method, std::string note = {}) {
    return out_.emplace_back(
        evenfield::known(std::move(name), region_, estimate, std::move(method), std::move(note)));
  }
  Quantity& unknown(std::string name, std::string reason) {
    return out_.emplace_back(evenfield::unknown(std::move(name), region_, std::move(reason)));
  }
  Quantity& root(std::string name,
                 const SpatialEstimate& s,
                 double divisor,
                 double divisor_relative,
                 std::string method,
                 std::string note) {
    return out_.emplace_back(root_of_square(std::move(name), region_, s.square, s.square_uncertainty, divisor,
                                            divisor_relative, std::move(method), std::move(note)));
  }
  std::vector<Quantity> take() { return std::move(out_); }
  const RegionLevels& levels() const { return levels_; }

 private:
  const RegionLevels& levels_;
  std::string region_;
  std::vector<Quantity> out_;
};

}  // namespace evenfield
