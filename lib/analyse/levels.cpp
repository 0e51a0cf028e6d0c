#include "analyse/levels.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "model/student.h"

namespace evenfield {
namespace {

/// Smallest spacing of these codes, or 0 if they are not multiples of one spacing (floating-point data).
double spacing(const std::vector<double>& codes) {
  double smallest = 0;
  for (std::size_t i = 1; i < codes.size(); ++i) {
    const double gap = codes[i] - codes[i - 1];
    if (smallest == 0 || gap < smallest) smallest = gap;
  }
  if (smallest == 0) return 0;
  for (const double code : codes) {
    const double steps = (code - codes.front()) / smallest;
    if (std::abs(steps - std::round(steps)) > 1e-3) return 0;
  }
  return smallest;
}

/// Number of codes of the converter up to `highest`, in steps: the next usual bit depth.
int usual_bit_depth(double highest_steps) {
  constexpr std::array kUsual{8, 10, 12, 14, 16, 18, 20, 24};
  for (const int bits : kUsual)
    if (highest_steps <= std::ldexp(1.0, bits) - 1) return bits;
  return 32;
}

double median(std::vector<double> values) {
  std::sort(values.begin(), values.end());
  const std::size_t n = values.size();
  return n % 2 == 1 ? values[n / 2] : 0.5 * (values[n / 2 - 1] + values[n / 2]);
}

double share_at(const Extreme& highest, double top_code, double samples) {
  return highest.code == top_code ? static_cast<double>(highest.count) / samples : 0.0;
}

}  // namespace

Codes find_codes(const AnalysisInput& input) {
  Codes out;
  bool stepped = true;
  double highest = -std::numeric_limits<double>::infinity();
  double lowest = std::numeric_limits<double>::infinity();
  double brightest = -std::numeric_limits<double>::infinity();
  const SeriesInput* bright = nullptr;
  for (const SeriesInput& series : input.series) {
    const double step = spacing(series.code_sample);
    if (series.code_sample.size() > 1) {
      if (step == 0) stepped = false;
      if (step > 0 && (out.step_dn == 0 || step < out.step_dn)) out.step_dn = step;
    }
    double mean = -std::numeric_limits<double>::infinity();
    for (const RegionSummary& region : series.regions) {
      highest = std::max(highest, region.highest.code);
      lowest = std::min(lowest, region.lowest.code);
      mean = std::max(mean, region.mean);
    }
    if (series.conditions.kind == SeriesKind::flat && mean > brightest) {
      brightest = mean;
      bright = &series;
    }
  }
  // Whole numbers that skip codes by chance are still whole numbers.
  if (!input.floating && (out.step_dn == 0 || !stepped)) out.step_dn = 1;
  if (input.floating && !stepped) out.step_dn = 0;

  // A code that most pixels of some block of the brightest series show is where they stop, whatever stops
  // them there.
  double most = 0;
  if (bright != nullptr)
    for (const RegionSummary& region : bright->regions)
      for (std::size_t b = 0; b < region.block_highest.size(); ++b) {
        const double share =
            static_cast<double>(region.block_highest[b].count) / (region.block_pixels[b] * region.frames);
        if (share > 0.5 && share > most) {
          // A code that is also the lowest of the session is no top: the frames are empty.
          if (region.block_highest[b].code <= lowest) continue;
          most = share;
          out.top_code = region.block_highest[b].code;
          out.plateau = true;
        }
      }
  // Codes that are all below zero were moved: they do not tell the converter's largest.
  if (out.step_dn > 0 && highest >= 0) {
    const double steps = std::round(highest / out.step_dn);
    // Codes in the high bits are stepped by a power of two; the converter's own codes are then highest /
    // step.
    const bool fits = input.bit_depth && steps <= std::ldexp(1.0, *input.bit_depth) - 1;
    const int bits = fits ? *input.bit_depth : usual_bit_depth(steps);
    if (!fits) out.inferred_bit_depth = bits;
    if (!out.top_code) out.top_code = (std::ldexp(1.0, bits) - 1) * out.step_dn;
  }
  return out;
}

RegionLevels::RegionLevels(const AnalysisInput& input, std::size_t region, const Codes& codes)
    : input_(input), region_(region), codes_(codes) {
  for (std::size_t s = 0; s < input.series.size(); ++s) {
    if (input.series[s].conditions.kind != SeriesKind::flat) continue;
    Level level;
    level.series = s;
    level.dark = match_dark(input, region, input.series[s].conditions);
    if (level.dark.mean.empty()) continue;
    const RegionSummary& flat = summary(s);
    level.signal = flat.mean - dark_mean(level.dark.mean);
    level.variance = flat.variance;
    if (!level.dark.variance.empty()) level.dark_variance = dark_variance(level.dark.variance);
    level.saturated_fraction = saturated_share(flat);
    for (const auto& [dark, weight] : level.dark.mean)
      level.saturated_fraction -= weight * saturated_share(summary(dark));
    levels_.push_back(level);
  }
  std::stable_sort(levels_.begin(), levels_.end(),
                   [](const Level& a, const Level& b) { return a.signal < b.signal; });
  find_scatter();
  find_range_top();
}

double RegionLevels::saturated_share(const RegionSummary& s) const {
  double count = 0;
  for (const Extreme& highest : s.block_highest)
    if (codes_.top_code && highest.code == *codes_.top_code) count += static_cast<double>(highest.count);
  return count / (s.pixels * s.frames);
}

bool RegionLevels::saturated(const Level& level) const { return level.saturated_fraction > kSaturatedShare; }

double RegionLevels::dark_mean(const SeriesWeights& weights) const {
  double sum = 0;
  for (const auto& [series, weight] : weights) sum += weight * summary(series).mean;
  return sum;
}

double RegionLevels::dark_variance(const SeriesWeights& weights) const {
  double sum = 0;
  for (const auto& [series, weight] : weights) sum += weight * summary(series).variance.value_or(0.0);
  return sum;
}

void RegionLevels::find_scatter() {
  double jitter = 0;
  for (std::size_t s = 0; s < input_.series.size(); ++s) {
    const RegionSummary& dark = summary(s);
    if (input_.series[s].conditions.kind == SeriesKind::flat || !dark.frame_mean_variance) continue;
    jitter += (dark.frames - 1) * *dark.frame_mean_variance;
    jitter_dof_ += dark.frames - 1;
  }
  if (jitter_dof_ > 0) jitter_ = std::sqrt(std::max(0.0, jitter / jitter_dof_));
  // What the dark level scatters is no scatter of the light. Dim levels, where it would be a per mille of the
  // signal or more, say little of the light.
  constexpr double kFlickerThatMatters = 1e-3;
  const double dim = jitter_ / kFlickerThatMatters;
  double flicker = 0;
  double weights = 0;
  for (const Level& level : levels_) {
    const RegionSummary& flat = summary(level.series);
    if (!flat.frame_mean_variance || !flat.scaled || saturated(level)) continue;
    const double square = level.signal * level.signal;
    const double weight = (flat.frames - 1) * std::pow(square / (square + dim * dim), 2);
    flicker += weight * (*flat.frame_mean_variance - jitter_ * jitter_) / square;
    weights += weight;
    flicker_dof_ += flat.frames - 1;
  }
  if (weights > 0) flicker_ = std::sqrt(std::max(0.0, flicker / weights));
}

double RegionLevels::mean_uncertainty(std::size_t series) const {
  const RegionSummary& s = summary(series);
  double between = jitter_ * jitter_;
  if (input_.series[series].conditions.kind == SeriesKind::flat) {
    const auto level =
        std::find_if(levels_.begin(), levels_.end(), [&](const Level& l) { return l.series == series; });
    const double signal = level == levels_.end() ? s.mean : level->signal;
    between += flicker_ * flicker_ * signal * signal;
  }
  // Of a single frame the spread inside blocks bounds the noise from above.
  double noise = s.variance.value_or(0.0);
  if (!s.variance)
    for (std::size_t b = 0; b < s.block_spread.size(); ++b)
      noise += s.block_pixels[b] * s.block_spread[b] * s.block_spread[b] / s.pixels;
  if (s.row_noise_variance) between += std::max(0.0, *s.row_noise_variance) / s.rows;
  return std::sqrt(noise / (s.pixels * s.frames) + between / s.frames);
}

/// Share of a block's samples at the top code.
double RegionLevels::block_share(std::size_t series, std::size_t block) const {
  const RegionSummary& s = summary(series);
  return share_at(s.block_highest[block], *codes_.top_code, s.block_pixels[block] * s.frames);
}

/// The same of the matching darks: pixels that are stuck there tell nothing of the light.
double RegionLevels::dark_share(const Level& level, std::size_t block) const {
  double share = 0;
  for (const auto& [series, weight] : level.dark.mean) share += weight * block_share(series, block);
  return share;
}

/// Signal of the block where `kSaturatedShare` of its pixels show the top code; infinite if none of the
/// levels gets there, NaN if all of them do. Between the last level below and the first level above, the
/// share is that of a normal distribution cut off at the top code, whose spread is the temporal noise, scaled
/// as shot noise from the level below, and the unevenness inside the block; where that leaves the interval of
/// the two levels, the share is interpolated on a straight line.
double RegionLevels::saturation_signal(std::size_t block,
                                       const std::vector<const Level*>& rising,
                                       double& noise) const {
  const Level* below = nullptr;
  for (const Level* level : rising) {
    const RegionSummary& flat = summary(level->series);
    double dark = 0;
    for (const auto& [series, weight] : level->dark.mean) dark += weight * summary(series).block_mean[block];
    const double share = block_share(level->series, block) - dark_share(*level, block);
    if (share < kSaturatedShare) {
      below = level;
      continue;
    }
    const double upper = flat.block_mean[block] - dark;
    const double top = *codes_.top_code - 0.5 * codes_.step_dn - dark;
    if (below == nullptr) return std::numeric_limits<double>::quiet_NaN();
    const RegionSummary& lower_flat = summary(below->series);
    double lower_dark = 0;
    for (const auto& [series, weight] : below->dark.mean)
      lower_dark += weight * summary(series).block_mean[block];
    const double lower = lower_flat.block_mean[block] - lower_dark;
    const double dof = lower_flat.block_dof[block];
    const double temporal = dof > 0 ? lower_flat.block_squares[block] / dof : 0.0;
    // The mean frame's spread less the noise that is left in it.
    const double spread_square = std::max(
        0.0, lower_flat.block_spread[block] * lower_flat.block_spread[block] - temporal / lower_flat.frames);
    const double z = normal_quantile(1 - kSaturatedShare);
    double signal = lower;
    for (int round = 0; round < 20 && lower > 0; ++round) {
      const double ratio = std::max(0.0, signal / lower);
      noise = std::sqrt(temporal * ratio + spread_square * ratio * ratio);
      signal = top - z * noise;
    }
    if (signal >= lower && signal <= (share < 0.5 ? upper : top)) return signal;
    noise = std::sqrt(temporal + spread_square);
    const double lower_share = block_share(below->series, block) - dark_share(*below, block);
    return lower + (kSaturatedShare - lower_share) / (share - lower_share) * (upper - lower);
  }
  return std::numeric_limits<double>::infinity();
}

void RegionLevels::find_range_top() {
  if (levels_.empty()) return;
  top_.signal_dn = levels_.back().signal;
  std::vector<const Level*> rising;
  for (const Level& level : levels_) rising.push_back(&level);
  // Past saturation the mean no longer rises; the order is then that of the light.
  std::stable_sort(rising.begin(), rising.end(), [&](const Level* a, const Level* b) {
    const Conditions& ca = input_.series[a->series].conditions;
    const Conditions& cb = input_.series[b->series].conditions;
    if (!ca.exposure_s || !cb.exposure_s) return a->signal < b->signal;
    return *ca.exposure_s * ca.light < *cb.exposure_s * cb.light;
  });
  if (!codes_.top_code) return;
  std::vector<double> signals;
  std::vector<double> noises;
  std::size_t without_level_below = 0;
  for (std::size_t b = 0; b < summary(levels_.front().series).block_mean.size(); ++b) {
    double noise = 0;
    const double signal = saturation_signal(b, rising, noise);
    if (std::isnan(signal)) ++without_level_below;
    signals.push_back(signal);
    noises.push_back(noise);
  }
  if (2 * without_level_below >= signals.size()) {
    top_.saturates = true;
    top_.unresolved = "every level is saturated; the upper limit is the signal of the darkest";
    top_.signal_dn = levels_.front().signal;
    return;
  }
  std::erase_if(signals, [](double signal) { return std::isnan(signal); });
  const double middle = median(signals);
  if (!std::isfinite(middle)) return;
  if (middle <= 0) {
    top_.saturates = true;
    top_.unresolved = "the signal at the top code comes out negative: the dark level of the flats is wrong";
    top_.signal_dn = 0;
    return;
  }
  top_.signal_dn = middle;
  top_.saturates = true;
  top_.noise_dn = median(noises);
  std::vector<double> deviations;
  for (const double s : signals)
    if (std::isfinite(s)) deviations.push_back(std::abs(s - middle));
  // Spread of the blocks' median (1.4826 x median deviation, 1.2533 / sqrt(blocks)), and half a standard
  // deviation of the pixels, evenly distributed, for what is not known of the shape of the cut distribution.
  const double blocks = 1.2533 * 1.4826 * median(deviations) / std::sqrt(static_cast<double>(signals.size()));
  top_.uncertainty_dn = std::hypot(blocks, 0.5 * top_.noise_dn / std::sqrt(3.0));
  if (top_.uncertainty_dn <= 0)
    top_.unresolved = "the frames show no noise, so nothing is known of the uncertainty";
}

std::string in_region(const RegionLevels& levels) {
  const std::string& name = levels.input().regions[levels.region()].name;
  return name == "whole" ? "" : " in region " + name;
}

}  // namespace evenfield
