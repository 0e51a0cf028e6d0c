#include "analyse/region_quantities.h"

#include <array>
#include <cmath>

#include "analyse/data_sheet_findings.h"
#include "analyse/quantity_list.h"
#include "model/gum.h"
#include "model/student.h"

namespace evenfield {
namespace {

std::string joined(const std::string& a, const std::string& b) {
  return a + (a.empty() || b.empty() ? "" : "; ") + b;
}

void gain_models(QuantityList& b, const GainAndNoise& gain, const std::string& range) {
  const Condition condition = light_condition(b.levels());
  const auto put = [&](const char* name, const std::optional<Estimate>& estimate, const std::string& method,
                       const std::string& note, const std::string& reason) {
    Quantity& q = estimate ? b.known(name, *estimate, method, note) : b.unknown(name, reason);
    q.condition = condition;
  };
  put("conversion_gain_line_dn_per_e", gain.line_gain,
      "maximum-likelihood line of temporal variance against signal, " + range +
          " and the dark; block jackknife",
      gain.gain_note, gain.gain_reason);
  put("conversion_gain_curved_dn_per_e", gain.curved_gain,
      "slope at low signal of V = b + K^2/(2a) (exp(2 a x/K) - 1), maximum likelihood, " + range +
          " and the dark; block jackknife",
      gain.gain_note, gain.curve_reason);
  put("variance_curvature_per_e", gain.curvature,
      "a of V = b + K^2/(2a) (exp(2 a x/K) - 1), fitted with the curved conversion gain; block jackknife",
      gain.gain_note, gain.curve_reason);
  put("conversion_gain_origin_line_dn_per_e", gain.origin_gain,
      "unweighted line through the origin of variance less dark variance against signal, " + range +
          ", as EMVA 1288 draws it (from memory); block jackknife",
      gain.gain_note, "the temporal variance does not rise with the signal");
  put("conversion_gain_lag_summed_dn_per_e", gain.lag_gain,
      "line of the variance plus the covariances with the eight neighbours, from the first two frames of " +
          std::to_string(gain.lag_levels.size()) +
          " light levels and the dark; noise shared beyond the neighbours is not in it; block jackknife",
      gain.gain_note, gain.lag_reason);
}

void gains(QuantityList& b, const GainAndNoise& gain) {
  const Condition condition = light_condition(b.levels());
  if (!gain.gain) {
    for (const char* name :
         {"conversion_gain_dn_per_e", "conversion_gain_e_per_dn", "conversion_gain_line_dn_per_e",
          "conversion_gain_curved_dn_per_e", "variance_curvature_per_e",
          "conversion_gain_origin_line_dn_per_e", "conversion_gain_lag_summed_dn_per_e"})
      b.unknown(name, gain.gain_reason).condition = condition;
    return;
  }
  const std::string range = std::to_string(gain.gain_levels.size()) +
                            (gain.gain_levels.size() == 1 ? " light level" : " light levels") +
                            " up to 70 % of the range";
  const std::string few = gain.gain_levels.size() == 1
                              ? "two points, one light level and the dark: a curved relation cannot be seen"
                              : "";
  const std::string note = joined(joined(few, gain.gain_model_note), gain.gain_note);
  b.known("conversion_gain_dn_per_e", *gain.gain,
          gain.curved ? "slope at low signal of the curved model, " + range + " and the dark; block jackknife"
                      : "maximum-likelihood line of temporal variance against signal, " + range +
                            " and the dark; block jackknife",
          note)
      .condition = condition;
  b.known("conversion_gain_e_per_dn", inverse(*gain.gain), "inverse of conversion_gain_dn_per_e", note)
      .condition = condition;
  gain_models(b, gain, range);
}

void dark_offset(QuantityList& b) {
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

void read_noise(QuantityList& b, const GainAndNoise& gain) {
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

void saturation(QuantityList& b, const GainAndNoise& gain) {
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
    b.unknown("saturation_capacity_e", top.unresolved.substr(0, top.unresolved.find(';'))).condition =
        condition;
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

void linearity(QuantityList& b, const Response& response) {
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

void pattern(QuantityList& b, const GainAndNoise& gain, const Nonuniformity& pattern) {
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

void dark_current(QuantityList& b, const GainAndNoise& gain, const DarkCurrent& dark) {
  Condition condition;
  if (dark.temperature_c) condition.emplace_back("temperature_c", *dark.temperature_c);
  const std::string reason = offset_is_regulated(gain, dark)
                                 ? "the camera holds its dark level, which hides dark current from the "
                                   "means; see the one from variances"
                                 : dark.reason;
  if (!reason.empty() || !dark.dn_per_s) {
    b.unknown("dark_current_dn_per_s", reason).condition = condition;
    b.unknown("dark_current_e_per_s", reason).condition = condition;
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
  QuantityList builder(levels);
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
