#include "analyse/region_quantities.h"

#include <array>
#include <cmath>

#include "model/gum.h"
#include "model/student.h"

namespace evenfield {
namespace {

using Condition = std::vector<std::pair<std::string, double>>;

Condition condition_of(const Conditions& c) {
  Condition out;
  if (c.exposure_s) out.emplace_back("exposure_s", *c.exposure_s);
  if (c.temperature_c) out.emplace_back("temperature_c", *c.temperature_c);
  if (c.em_gain) out.emplace_back("em_gain", *c.em_gain);
  if (c.control_v) out.emplace_back("control_v", *c.control_v);
  return out;
}

/// The condition of a number that rests on all levels: what they share.
Condition light_condition(const RegionLevels& levels) {
  Condition out;
  if (levels.levels().empty()) return out;
  Conditions shared = levels.input().series[levels.levels().front().series].conditions;
  shared.exposure_s.reset();
  return condition_of(shared);
}

/// value x factor, where both are uncertain and independent.
Estimate product(
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
Estimate inverse(const Estimate& gain) {
  const double value = 1 / gain.value;
  return {value, value * gain.statistical_uncertainty / gain.value,
          value * gain.common_uncertainty / gain.value, gain.degrees_of_freedom};
}

class Builder {
 public:
  explicit Builder(const RegionLevels& levels)
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

void gains(Builder& b, const GainAndNoise& gain) {
  const Condition condition = light_condition(b.levels());
  if (!gain.gain) {
    for (const char* name : {"conversion_gain_dn_per_e", "conversion_gain_e_per_dn",
                             "conversion_gain_line_dn_per_e", "conversion_gain_origin_line_dn_per_e"})
      b.unknown(name, gain.gain_reason).condition = condition;
    return;
  }
  const std::string levels = std::to_string(gain.gain_levels.size()) +
                             (gain.gain_levels.size() == 1 ? " light level" : " light levels");
  std::string note = gain.gain_levels.size() == 1
                         ? "two points, one light level and the dark: a curved relation cannot be seen"
                         : "";
  if (!gain.gain_note.empty()) note += (note.empty() ? "" : "; ") + gain.gain_note;
  const std::string method = "maximum-likelihood line of temporal variance against signal, " + levels +
                             " up to 70 % of the range and the dark; block jackknife";
  b.known("conversion_gain_dn_per_e", *gain.gain, method, note).condition = condition;
  b.known("conversion_gain_e_per_dn", inverse(*gain.gain), "inverse of conversion_gain_dn_per_e", note)
      .condition = condition;
  b.known("conversion_gain_line_dn_per_e", *gain.gain, method, note).condition = condition;
  if (gain.origin_gain)
    b.known("conversion_gain_origin_line_dn_per_e", *gain.origin_gain,
            "unweighted line through the origin of variance less dark variance against signal, " + levels +
                ", as EMVA 1288 draws it (from memory); block jackknife",
            note)
        .condition = condition;
  else
    b.unknown("conversion_gain_origin_line_dn_per_e", "the temporal variance does not rise with the signal")
        .condition = condition;
}

void dark_offset(Builder& b) {
  const RegionLevels& levels = b.levels();
  std::vector<std::size_t> darks;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s)
    if (levels.input().series[s].conditions.kind != SeriesKind::flat) darks.push_back(s);
  if (darks.empty()) {
    b.unknown("dark_offset_dn", "needs a dark or bias series");
    return;
  }
  darks = shortest_exposure(levels.input(), darks);
  double frames = 0;
  for (const std::size_t s : darks) frames += levels.summary(s).frames;
  double mean = 0;
  double temporal = 0;
  double variance = 0;
  bool repeated = false;
  for (const std::size_t s : darks) {
    const RegionSummary& dark = levels.summary(s);
    const double weight = dark.frames / frames;
    mean += weight * dark.mean;
    variance += std::pow(weight * levels.mean_uncertainty(s), 2);
    temporal += weight * weight * dark.variance.value_or(0.0) / (dark.pixels * dark.frames);
    repeated = repeated || dark.variance.has_value();
  }
  const Condition condition = condition_of(levels.input().series[darks.front()].conditions);
  if (!repeated || variance <= 0) {
    Quantity& q = b.unknown(
        "dark_offset_dn",
        repeated ? "the darks show no noise, so nothing is known of the uncertainty; their mean is " +
                       std::to_string(mean) + " DN"
                 : "one dark frame does not tell how far its mean can be trusted; it is " +
                       std::to_string(mean) + " DN");
    q.condition = condition;
    return;
  }
  const std::array parts{
      Contribution{std::sqrt(std::max(0.0, variance - temporal)), std::max(1.0, levels.offset_jitter_dof())},
      Contribution{std::sqrt(temporal), 1e300}};
  b.known("dark_offset_dn", {mean, std::sqrt(variance), 0.0, effective_degrees_of_freedom(parts)},
          "mean of the darks of the shortest exposure; temporal noise and scatter of frame means")
      .condition = condition;
}

void read_noise(Builder& b, const GainAndNoise& gain) {
  Condition condition;
  if (gain.read_exposure_s) condition.emplace_back("exposure_s", *gain.read_exposure_s);
  std::string note = gain.read_noise_note;
  if (!gain.gain_note.empty()) note += (note.empty() ? "" : "; ") + gain.gain_note;
  if (gain.read_noise_dn) {
    b.known("read_noise_dn", *gain.read_noise_dn, gain.read_noise_method + "; block jackknife", note)
        .condition = condition;
  } else {
    Quantity& q = b.unknown("read_noise_dn", gain.read_noise_reason);
    q.condition = condition;
    q.high95 = gain.read_noise_high95_dn;
  }
  if (gain.read_noise_e) {
    b.known("read_noise_e", *gain.read_noise_e,
            gain.read_noise_method + ", over the conversion gain; block jackknife of both", note)
        .condition = condition;
  } else {
    Quantity& q = b.unknown("read_noise_e", gain.read_noise_reason.empty()
                                                ? "needs the conversion gain: " + gain.gain_reason
                                                : gain.read_noise_reason);
    q.condition = condition;
    if (gain.read_noise_high95_dn && gain.gain) q.high95 = *gain.read_noise_high95_dn / gain.gain->value;
  }
}

void saturation(Builder& b, const GainAndNoise& gain) {
  const RangeTop& top = b.levels().top();
  const Condition condition = light_condition(b.levels());
  if (b.levels().levels().empty()) {
    b.unknown("saturation_dn", "needs flats and matching darks").condition = condition;
    b.unknown("saturation_capacity_e", "needs flats and matching darks").condition = condition;
    return;
  }
  if (top.saturates && !top.unresolved.empty()) {
    Quantity& dn = b.unknown("saturation_dn", top.unresolved);
    dn.condition = condition;
    if (top.signal_dn > 0) dn.high95 = top.signal_dn;
    b.unknown("saturation_capacity_e", top.unresolved).condition = condition;
    return;
  }
  if (!top.saturates) {
    const std::string reason =
        b.levels().codes().top_code
            ? "no level has 0.2 % of its pixels at the top code; the lower limit is the brightest level's "
              "signal"
            : "the frames have no top code; the lower limit is the brightest level's signal";
    Quantity& dn = b.unknown("saturation_dn", reason);
    dn.condition = condition;
    if (top.signal_dn > 0) dn.low95 = top.signal_dn;
    Quantity& e = b.unknown("saturation_capacity_e", reason);
    e.condition = condition;
    // One-sided 95 % for the gain that turns DN into electrons.
    if (gain.gain && top.signal_dn > 0)
      e.low95 = top.signal_dn / (gain.gain->value + student_quantile(0.95, gain.gain->degrees_of_freedom) *
                                                        gain.gain->statistical_uncertainty);
    return;
  }
  const std::string method =
      "signal at which 0.2 % of a block's pixels show the top code, median of blocks; between levels the "
      "pixels are taken as normally distributed";
  b.known("saturation_dn", {top.signal_dn, top.uncertainty_dn, 0.0, std::nullopt}, method).condition =
      condition;
  if (gain.gain)
    b.known(
         "saturation_capacity_e",
         product(top.signal_dn, top.uncertainty_dn, std::nullopt, 1 / gain.gain->value, inverse(*gain.gain)),
         method + "; over the conversion gain")
        .condition = condition;
  else
    b.unknown("saturation_capacity_e", "needs the conversion gain: " + gain.gain_reason).condition =
        condition;
}

void linearity(Builder& b, const Response& response) {
  const Condition condition = light_condition(b.levels());
  if (!response.error_percent) {
    b.unknown("linearity_error_percent", response.reason).condition = condition;
    return;
  }
  Quantity& q = b.known("linearity_error_percent", *response.error_percent,
                        "mean |deviation| from the line weighted 1/signal^2 between 5 and 95 % of the range, "
                        "after EMVA 1288 (from memory)",
                        response.note);
  q.condition = condition;
  // A mean of absolute deviations counts noise as deviation: the lower end allows for all of it.
  q.low95 = std::max(0.0, *q.low95 - response.floor_percent);
}

void pattern(Builder& b, const GainAndNoise& gain, const Nonuniformity& pattern) {
  const RegionLevels& levels = b.levels();
  const auto frames = [&](const SpatialEstimate& s) {
    return std::to_string(levels.summary(s.series).frames) + " frames";
  };
  if (pattern.dark) {
    const Condition condition = condition_of(levels.input().series[pattern.dark->series].conditions);
    const std::string method = "spatial variance of the mean of " + frames(*pattern.dark) +
                               " without light, temporal noise taken out, after EMVA 1288 (from memory)";
    b.root("dsnu_dn", *pattern.dark, 1.0, 0.0, method, "").condition = condition;
    if (gain.gain)
      b.root("dsnu_e", *pattern.dark, gain.gain->value, gain.gain->statistical_uncertainty / gain.gain->value,
             method, "")
          .condition = condition;
    else
      b.unknown("dsnu_e", "needs the conversion gain: " + gain.gain_reason).condition = condition;
  } else {
    b.unknown("dsnu_dn", pattern.dark_reason);
    b.unknown("dsnu_e", pattern.dark_reason);
  }
  if (pattern.light) {
    const double relative = pattern.light_signal_uncertainty_dn / pattern.light_signal_dn;
    b.root("prnu_percent", *pattern.light, pattern.light_signal_dn / 100, relative,
           "spatial variance of the mean of " + frames(*pattern.light) +
               " near half range less the dark's, temporal noise taken out, after EMVA 1288 (from memory)",
           "unfiltered: uneven light is part of it")
        .condition = condition_of(levels.input().series[pattern.light->series].conditions);
  } else {
    b.unknown("prnu_percent", pattern.light_reason).condition = light_condition(levels);
  }
}

void dark_current(Builder& b, const GainAndNoise& gain, const DarkCurrent& dark) {
  Condition condition;
  if (dark.temperature_c) condition.emplace_back("temperature_c", *dark.temperature_c);
  if (!dark.dn_per_s) {
    b.unknown("dark_current_dn_per_s", dark.reason).condition = condition;
    b.unknown("dark_current_e_per_s", dark.reason).condition = condition;
    return;
  }
  const std::string method = "straight line through the dark means against exposure, weighted by frames";
  b.known("dark_current_dn_per_s", *dark.dn_per_s, method, dark.note).condition = condition;
  if (gain.gain)
    b.known("dark_current_e_per_s",
            product(dark.dn_per_s->value, dark.dn_per_s->statistical_uncertainty,
                    dark.dn_per_s->degrees_of_freedom, 1 / gain.gain->value, inverse(*gain.gain)),
            method + "; over the conversion gain", dark.note)
        .condition = condition;
  else
    b.unknown("dark_current_e_per_s", "needs the conversion gain: " + gain.gain_reason).condition = condition;
}

}  // namespace

std::vector<Quantity> region_quantities(const RegionLevels& levels,
                                        const GainAndNoise& gain,
                                        const Response& response,
                                        const Nonuniformity& nonuniformity,
                                        const DarkCurrent& dark) {
  Builder builder(levels);
  gains(builder, gain);
  dark_offset(builder);
  read_noise(builder, gain);
  saturation(builder, gain);
  linearity(builder, response);
  pattern(builder, gain, nonuniformity);
  dark_current(builder, gain, dark);
  return builder.take();
}

}  // namespace evenfield
