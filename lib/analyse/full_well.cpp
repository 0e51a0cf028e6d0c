#include "analyse/full_well.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "base/text.h"

namespace evenfield {
namespace {

constexpr double kTurnOff = 3.0;
constexpr double kOneSided = 1.645;  // 95 % of a normal distribution

/// Levels by rising light, as far as it is known: past saturation the signal no longer tells.
std::vector<const Level*> by_light(const RegionLevels& levels) {
  std::vector<const Level*> rising;
  for (const Level& level : levels.levels()) rising.push_back(&level);
  std::stable_sort(rising.begin(), rising.end(), [&](const Level* a, const Level* b) {
    const auto x = axis_of(levels, *a);
    const auto y = axis_of(levels, *b);
    return x && y ? *x < *y : a->signal < b->signal;
  });
  return rising;
}

double variance_uncertainty(const RegionLevels& levels, const Level& level) {
  return *level.variance * std::sqrt(2 / levels.summary(level.series).dof);
}

void find_charge_limit(const RegionLevels& levels, FullWell& out) {
  const Level* highest = nullptr;    // of the variances so far
  const Level* brightest = nullptr;  // of the signals so far
  for (const Level* level : by_light(levels)) {
    if (!level->variance || !(levels.summary(level->series).dof > 0)) continue;
    // Where the signal itself has fallen, less light explains less variance.
    constexpr double kSameSignal = 0.98;
    if (brightest != nullptr && level->signal < kSameSignal * brightest->signal) continue;
    if (highest != nullptr) {
      const double step =
          std::hypot(variance_uncertainty(levels, *highest), variance_uncertainty(levels, *level));
      if (*level->variance < *highest->variance - kTurnOff * step) {
        out.variance_maximum_dn = highest->signal;
        if (levels.saturated(*level)) {
          out.converter_limited = true;
          out.charge_reason = "converter-limited: the variance turns down where pixels show the top code";
          return;
        }
        // Full wells lie between the last level before and the highest signal that is reached without the top
        // code.
        const double low = brightest->signal;
        double high = low;
        for (const Level& any : levels.levels())
          if (!levels.saturated(any)) high = std::max(high, any.signal);
        out.charge_dn = Estimate{
            high, std::hypot((high - low) / std::sqrt(12.0), levels.mean_uncertainty(brightest->series)), 0.0,
            std::nullopt};
        return;
      }
    }
    if (highest == nullptr || *level->variance > *highest->variance) highest = level;
    if (brightest == nullptr || level->signal > brightest->signal) brightest = level;
  }
  if (brightest == nullptr) {
    out.charge_reason = "needs flats of two frames or more and matching darks";
    return;
  }
  out.charge_reason = "the variance never turns down; the lower limit is the brightest level's signal";
  out.charge_low95_dn = brightest->signal - kOneSided * levels.mean_uncertainty(brightest->series);
}

void find_linear_limit(const RegionLevels& levels, const Response& response, FullWell& out) {
  if (!response.line) {
    out.linear_reason = response.reason;
    return;
  }
  const Level* before = nullptr;
  double deviation_before = 0;
  for (const Level* level : by_light(levels)) {
    const auto axis = axis_of(levels, *level);
    if (!axis || level->signal < 0.5 * levels.top().signal_dn) continue;
    const double deviation = response.line->deviation_percent({*axis, level->signal});
    if (std::abs(deviation) >= kLinearFullWellPercent) {
      if (before == nullptr) {
        out.linear_reason =
            "the first level above half of the range is already " + to_text(deviation, 2) + " % off the line";
        return;
      }
      // Interpolated in the deviation, on the side of the crossing.
      const double limit = deviation < 0 ? -kLinearFullWellPercent : kLinearFullWellPercent;
      const double share = (limit - deviation_before) / (deviation - deviation_before);
      const double signal = before->signal + share * (level->signal - before->signal);
      const double slope = (level->signal - before->signal) / (deviation - deviation_before);
      const double noise = std::hypot((1 - share) * levels.mean_uncertainty(before->series) / before->signal,
                                      share * levels.mean_uncertainty(level->series) / level->signal);
      // Where between the two levels the response leaves the line a kink does not tell, and a straight line
      // between them errs to one side: the root of the mean square over the bracket, not its standard
      // deviation.
      const double bracket = std::abs(level->signal - before->signal) / std::sqrt(3.0);
      out.linear_dn = Estimate{signal, std::hypot(bracket, slope * 100 * noise), 0.0, std::nullopt};
      return;
    }
    before = level;
    deviation_before = deviation;
  }
  if (before == nullptr) {
    out.linear_reason = "no level lies above half of the range top";
    return;
  }
  out.linear_reason = "no level is off the line by " + to_text(kLinearFullWellPercent, 2) +
                      " %; the lower limit is the brightest level's signal";
  out.linear_low95_dn = before->signal - kOneSided * levels.mean_uncertainty(before->series);
}

}  // namespace

FullWell find_full_well(const RegionLevels& levels, const Response& response) {
  FullWell out;
  find_charge_limit(levels, out);
  find_linear_limit(levels, response, out);
  return out;
}

}  // namespace evenfield
