#include "analyse/data_sheet_quantities.h"

#include <cmath>
#include <numbers>

#include "analyse/quantity_list.h"
#include "analyse/second_look.h"
#include "base/text.h"
#include "model/noise_budget.h"
#include "model/quantization.h"
#include "model/read_noise.h"
#include "model/student.h"

namespace evenfield {
namespace {

std::string needs_gain(const GainAndNoise& gain) { return "needs the conversion gain: " + gain.gain_reason; }

/// A signal of the region in electrons.
Estimate in_electrons(const Estimate& dn, const GainAndNoise& gain) {
  return product(dn.value, dn.statistical_uncertainty, dn.degrees_of_freedom, 1 / gain.gain->value,
                 inverse(*gain.gain));
}

/// One-sided 95 % lower limit in electrons of a signal in DN that is exceeded.
double lower_limit_e(double signal_dn, const GainAndNoise& gain) {
  return signal_dn / (gain.gain->value + student_quantile(0.95, gain.gain->degrees_of_freedom) *
                                             gain.gain->statistical_uncertainty);
}

void noise_parts(QuantityList& b, const GainAndNoise& gain, const DarkNoiseParts& parts) {
  if (parts.row) {
    const Condition condition = condition_of(b.levels().input().series[parts.row->series].conditions);
    const std::string method =
        "row means of the differences of consecutive darks, pixels' own noise taken out";
    b.root("row_noise_dn", *parts.row, 1.0, 0.0, method, "").condition = condition;
    if (gain.gain)
      b.root("row_noise_e", *parts.row, gain.gain->value,
             gain.gain->statistical_uncertainty / gain.gain->value, method, "")
          .condition = condition;
    else
      b.unknown("row_noise_e", needs_gain(gain)).condition = condition;
  } else {
    b.unknown("row_noise_dn", parts.row_reason);
    b.unknown("row_noise_e", parts.row_reason);
  }
  if (parts.frame) {
    Quantity& q =
        b.root("offset_jitter_dn", *parts.frame, 1.0, 0.0,
               "scatter of the frame means of the darks of the shortest exposure, the series of most frames; "
               "noise of pixels and rows taken out",
               "");
    q.condition = condition_of(b.levels().input().series[parts.frame->series].conditions);
    // Few frames: their scatter is distributed as chi^2, whose interval is not symmetric.
    const double dof = b.levels().summary(parts.frame->series).frames - 1.0;
    const double own =
        parts.frame->square_uncertainty / std::sqrt(2 / dof) - std::max(0.0, parts.frame->square);
    const auto [low, high] = deviation_interval_factors(0.95, dof);
    const double total = parts.frame->square + own;
    if (q.value) {
      q.degrees_of_freedom = dof;
      q.low95 = std::sqrt(std::max(0.0, total * low * low - own));
      q.high95 = std::sqrt(std::max(0.0, total * high * high - own));
    }
  } else {
    b.unknown("offset_jitter_dn", parts.frame_reason);
  }
}

void median_noise(QuantityList& b, const GainAndNoise& gain) {
  const RegionLevels& levels = b.levels();
  const auto series = noise_series(levels);
  if (!series) {
    b.unknown("read_noise_median_e", "needs a dark or bias series of two frames or more");
    return;
  }
  const Condition condition = condition_of(levels.input().series[*series].conditions);
  const RegionSummary& dark = levels.summary(*series);
  const auto& looks = levels.input().mean_frames;
  std::string reason;
  std::optional<double> median;
  double log_variance = 0;
  if (dark.frames < kFramesForPixelNoise)
    reason = "needs " + std::to_string(kFramesForPixelNoise) +
             " dark frames of one series or more; there are " + std::to_string(dark.frames);
  else if (*series < looks.size() && levels.region() < looks[*series].size()) {
    median = looks[*series][levels.region()].median_noise_dn;
    log_variance = looks[*series][levels.region()].noise_log_variance;
  }
  if (reason.empty() && !median) reason = "the noise of single pixels was not looked at";
  if (reason.empty() && !gain.gain) reason = needs_gain(gain);
  if (reason.empty() && !gain.read_noise_dn) reason = gain.read_noise_reason;
  if (!reason.empty()) {
    b.unknown("read_noise_median_e", reason).condition = condition;
    return;
  }
  // The median of standard deviations of F frames, freed of its bias and of quantization.
  const double sigma = *median / deviation_median(dark.frames, log_variance);
  const double square = sigma * sigma - quantization_variance(levels.codes().step_dn);
  if (!(square > 0)) {
    b.unknown("read_noise_median_e", "the step of the codes hides the noise").condition = condition;
    return;
  }
  const double noise = std::sqrt(square);
  // A median of n values scatters sqrt(pi/2) times as much as their mean.
  const double spread = std::max(log_variance, deviation_log_variance(dark.frames));
  const double relative = std::sqrt(std::numbers::pi / 2 * spread / dark.pixels) * sigma * sigma / square;
  b.known("read_noise_median_e",
          product(noise, noise * relative, std::nullopt, 1 / gain.gain->value, inverse(*gain.gain)),
          "median over the pixels of their temporal standard deviation in " + std::to_string(dark.frames) +
              " darks, its bias and quantization taken out; over the conversion gain")
      .condition = condition;
}

void pattern_parts(QuantityList& b, const GainAndNoise& gain, const DataSheet& sheet) {
  const RegionLevels& levels = b.levels();
  const Nonuniformity& whole = sheet.nonuniformity;
  const std::string lines =
      "rows, columns and pixels as random effects, temporal noise of pixels and rows taken out";
  const std::string less = "of the flat near half range less its dark: ";
  const std::string filter =
      "mean frame less its low-pass (boxes of 7 and 11 pixels and a binomial of 3), as EMVA 1288 R3.1 has it "
      "(from "
      "memory); temporal noise taken out, divided by the filter's gain for white noise";
  const auto put = [&](const std::string& name, const std::optional<PatternPart>& part,
                       const std::string& reason, double divisor, double divisor_relative,
                       const Condition& condition, const std::string& method, const std::string& note) {
    if (!part) {
      b.unknown(name, reason).condition = condition;
      return;
    }
    Quantity& q =
        b.root(name, {part->square, part->square_uncertainty, 0}, divisor, divisor_relative, method, note);
    q.condition = condition;
    if (part->degrees_of_freedom && *part->degrees_of_freedom < 1e6 && q.value)
      q.degrees_of_freedom = part->degrees_of_freedom;
  };
  const auto filtered = [](const PatternParts& parts, double divisor, const std::string& unit) {
    return parts.high_pass_filtered_dn
               ? "not divided by the filter's gain: " + to_text(*parts.high_pass_filtered_dn / divisor, 6) +
                     " " + unit
               : "";
  };
  const Condition dark =
      whole.dark ? condition_of(levels.input().series[whole.dark->series].conditions) : Condition{};
  const double k = gain.gain ? gain.gain->value : 1.0;
  const double relative = gain.gain ? gain.gain->statistical_uncertainty / k : 0.0;
  const auto dark_part = [&](const std::string& name, std::optional<PatternPart> part, std::string reason,
                             const std::string& method, const std::string& note) {
    if (part && !gain.gain) {
      part.reset();
      reason = needs_gain(gain);
    }
    put(name, part, reason, k, relative, dark, method, note);
  };
  const PatternParts& d = sheet.patterns.dark;
  dark_part("dsnu_row_e", d.row, d.reason, lines, "");
  dark_part("dsnu_column_e", d.column, d.reason, lines, "");
  dark_part("dsnu_pixel_e", d.pixel, d.reason, lines, "");
  dark_part("dsnu_highpass_e", d.high_pass, d.high_pass_reason, filter, filtered(d, k, "e-"));
  const Condition light = whole.light ? condition_of(levels.input().series[whole.light->series].conditions)
                                      : light_condition(levels);
  const double signal = whole.light ? whole.light_signal_dn / 100 : 1.0;
  const double signal_relative =
      whole.light ? whole.light_signal_uncertainty_dn / whole.light_signal_dn : 0.0;
  const PatternParts& p = sheet.patterns.light;
  const std::string uneven = "unfiltered: uneven light is part of it";
  put("prnu_row_percent", p.row, p.reason, signal, signal_relative, light, less + lines, uneven);
  put("prnu_column_percent", p.column, p.reason, signal, signal_relative, light, less + lines, uneven);
  put("prnu_pixel_percent", p.pixel, p.reason, signal, signal_relative, light, less + lines, uneven);
  put("prnu_highpass_percent", p.high_pass, p.high_pass_reason, signal, signal_relative, light, less + filter,
      filtered(p, signal, "%"));
}

void full_well(QuantityList& b, const GainAndNoise& gain, const FullWell& well) {
  const Condition condition = light_condition(b.levels());
  const auto put = [&](const char* name, const std::optional<Estimate>& dn,
                       const std::optional<double>& low_dn, const std::string& reason,
                       const std::string& method, const std::string& note) {
    if (!gain.gain) {
      b.unknown(name, dn || low_dn ? needs_gain(gain) : reason).condition = condition;
      return;
    }
    if (dn) {
      b.known(name, in_electrons(*dn, gain), method + "; over the conversion gain", note).condition =
          condition;
      return;
    }
    Quantity& q = b.unknown(name, reason);
    q.condition = condition;
    if (low_dn && *low_dn > 0) q.low95 = lower_limit_e(*low_dn, gain);
  };
  const std::string maximum =
      well.variance_maximum_dn ? "the variance is largest at " + to_text(*well.variance_maximum_dn, 6) + " DN"
                               : "";
  put("full_well_e", well.charge_dn, well.charge_low95_dn,
      well.charge_reason + (maximum.empty() ? "" : "; " + maximum),
      "highest signal, once the temporal variance has fallen three standard uncertainties below its maximum; "
      "the "
      "last level before that bounds it from below",
      maximum);
  put("linear_full_well_e", well.linear_dn, well.linear_low95_dn, well.linear_reason,
      "from half of the range top upward, first crossing of " + to_text(kLinearFullWellPercent, 2) +
          " % from the line of the linearity error, interpolated",
      "");
}

void ratio(QuantityList& b,
           const std::string& stem,
           bool bits_too,
           const std::optional<Estimate>& value,
           const std::optional<double>& low95,
           const std::string& reason,
           const std::string& method) {
  const Condition condition = light_condition(b.levels());
  const auto put = [&](const std::string& name, auto convert, double unit) {
    if (value) {
      const double relative = value->statistical_uncertainty / value->value;
      b.known(name,
              {convert(value->value), unit > 0 ? unit * relative : value->statistical_uncertainty, 0.0,
               value->degrees_of_freedom},
              method)
          .condition = condition;
      return;
    }
    Quantity& q = b.unknown(name, reason);
    q.condition = condition;
    if (low95 && *low95 > 0) q.low95 = convert(*low95);
  };
  put(
      stem + "_ratio", [](double r) { return r; }, 0.0);
  put(
      stem + "_db", [](double r) { return decibels(r); }, decibel_uncertainty(1.0));
  if (bits_too)
    put(
        stem + "_bits", [](double r) { return bits(r); }, 1 / std::log(2.0));
}

void sensitivity(QuantityList& b,
                 const GainAndNoise& gain,
                 const Sensitivity& s,
                 const Efficiency& efficiency) {
  const Condition condition = light_condition(b.levels());
  ratio(b, "dynamic_range", true, s.dynamic_range, s.dynamic_range_low95, s.range_reason,
        "saturation over threshold, both in DN: x_sat / (sigma_y.dark + K/2), after EMVA 1288 (from memory)");
  ratio(b, "snr_max", false, s.snr_max, s.snr_max_low95, s.range_reason,
        "square root of the saturation capacity, after EMVA 1288 (from memory)");
  const std::string method = "sigma_y.dark / K + 1/2, quantization included, after EMVA 1288 (from memory)";
  if (!s.threshold_e) {
    Quantity& q = b.unknown("absolute_threshold_e", s.noise_reason);
    q.condition = condition;
    // Where the step hides the noise, the standard puts 0.49 steps in its place.
    if (gain.read_noise_high95_dn && gain.gain)
      q.high95 = threshold_e(std::sqrt(0.24) * b.levels().codes().step_dn / gain.gain->value);
    b.unknown("absolute_threshold_photons", s.noise_reason).condition = condition;
    return;
  }
  b.known("absolute_threshold_e", *s.threshold_e, method,
          "exactly where the ratio is 1: " + to_text(*s.exact_threshold_e, 6) + " e-")
      .condition = condition;
  if (!efficiency.percent) {
    b.unknown("absolute_threshold_photons", efficiency.reason).condition = condition;
    return;
  }
  const Estimate& eta = *efficiency.percent;
  const double photons = 100 * s.threshold_e->value / eta.value;
  const double statistical = std::hypot(s.threshold_e->statistical_uncertainty / s.threshold_e->value,
                                        eta.statistical_uncertainty / eta.value);
  b.known("absolute_threshold_photons",
          {photons, photons * statistical, photons * eta.common_uncertainty / eta.value,
           s.threshold_e->degrees_of_freedom},
          method + "; over the quantum efficiency")
      .condition = condition;
}

void dark_current(QuantityList& b, const GainAndNoise& gain, const DarkCurrent& dark) {
  Condition condition;
  if (dark.temperature_c) condition.emplace_back("temperature_c", *dark.temperature_c);
  if (!dark.variance_dn2_per_s || !gain.gain) {
    b.unknown("dark_current_from_variance_e_per_s",
              dark.variance_dn2_per_s ? needs_gain(gain) : dark.variance_reason)
        .condition = condition;
    return;
  }
  const double k = gain.gain->value;
  Estimate square = inverse(*gain.gain);
  square.value = 1 / (k * k);
  square.statistical_uncertainty = 2 * gain.gain->statistical_uncertainty / (k * k * k);
  b.known(
       "dark_current_from_variance_e_per_s",
       product(dark.variance_dn2_per_s->value, dark.variance_dn2_per_s->statistical_uncertainty,
               dark.variance_dn2_per_s->degrees_of_freedom, square.value, square),
       "straight line through the dark variances against exposure, weighted by their uncertainty; over the "
       "square of the conversion gain")
      .condition = condition;
}

/// Photons are counted from the stated exposures.
std::string clock_note(const ShutterOffset& shutter) {
  if (!shutter.seconds || std::abs(shutter.seconds->value) < 5 * shutter.seconds->statistical_uncertainty)
    return "";
  return "photons are counted for the stated exposures; light was collected for " +
         to_text(shutter.seconds->value, 3) + " s more (shutter_offset_s), which is not taken into account";
}

void response(QuantityList& b, const ShutterOffset& shutter, const Efficiency& efficiency) {
  const Condition condition = light_condition(b.levels());
  if (shutter.seconds)
    b.known("shutter_offset_s", *shutter.seconds,
            "offset of exposure_s in the line of the linearity error; the light is collected for exposure_s "
            "plus it")
        .condition = condition;
  else
    b.unknown("shutter_offset_s", shutter.reason).condition = condition;
  Condition light = condition;
  if (efficiency.wavelength_nm) light.emplace_back("wavelength_nm", *efficiency.wavelength_nm);
  if (efficiency.dn_per_photon)
    b.known("responsivity_dn_per_photon", *efficiency.dn_per_photon,
            "unweighted line through the origin of signal against photons, levels of the gain, after EMVA "
            "1288 (from memory)",
            clock_note(shutter))
        .condition = light;
  else
    b.unknown("responsivity_dn_per_photon", efficiency.reason).condition = light;
  if (efficiency.percent)
    b.known("quantum_efficiency_percent", *efficiency.percent,
            "responsivity over conversion gain, of the whole pixel area", clock_note(shutter))
        .condition = light;
  else
    b.unknown("quantum_efficiency_percent", efficiency.reason).condition = light;
}

}  // namespace

std::vector<Quantity> data_sheet_quantities(const RegionLevels& levels,
                                            const GainAndNoise& gain,
                                            const DarkCurrent& dark,
                                            const DataSheet& sheet) {
  QuantityList list(levels);
  median_noise(list, gain);
  noise_parts(list, gain, sheet.noise_parts);
  pattern_parts(list, gain, sheet);
  full_well(list, gain, sheet.full_well);
  sensitivity(list, gain, sheet.sensitivity, sheet.efficiency);
  dark_current(list, gain, dark);
  response(list, sheet.shutter, sheet.efficiency);
  return list.take();
}

}  // namespace evenfield
