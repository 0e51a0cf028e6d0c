#pragma once
/// A made-up result with everything in it that a report can show; values are plausible, none is measured.

#include <cmath>
#include <random>
#include <string>

#include "result/characterization.h"

namespace evenfield {

struct MadeUp {
  int levels = 14;
  int regions = 1;
  double top_dn = 3800;     ///< signal of the brightest level
  double lowest_share = 0;  ///< lowest level over top; 0: evenly spaced
  bool darks = true;
  int frames_per_series = 8;
};

inline RegionCurves made_up_curves(const std::string& region, const MadeUp& shape, std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  RegionCurves curves;
  curves.region = region;
  const double gain = 0.46, top = shape.top_dn;
  curves.range_top_dn = 0.96 * top;
  curves.gain_range_dn = 0.7 * 0.96 * top;
  curves.saturates = shape.levels > 1;
  for (int i = 0; i < shape.levels; ++i) {
    const double share = (i + 1.0) / shape.levels;
    const double light = shape.lowest_share > 0 ? std::pow(shape.lowest_share, 1 - share) : share;
    const bool saturated = light > 0.97 && shape.levels > 1;
    const double x = light * top, u = 0.004 * gain * x;
    const bool used = x <= *curves.gain_range_dn;
    curves.photon_transfer.push_back(
        {x, saturated ? 0.2 * gain * x : gain * x + u * normal(random), u, gain * x, used});
    const double line = 1.001 * x;
    curves.response.push_back({0.02 * light, saturated ? 0.97 * x : x * (1 + 0.002 * normal(random)),
                               0.0015 * x, line, light > 0.05 && light < 0.95});
    for (int k = 0; k < shape.frames_per_series; ++k)
      curves.frame_means.push_back(
          {i, SeriesKind::flat, 1 + 0.002 * k / 8.0 - 0.001 + 0.0004 * normal(random), 0, 0.0003});
  }
  for (int i = 0; shape.darks && i < 2; ++i)
    for (int k = 0; k < 2 * shape.frames_per_series; ++k)
      curves.frame_means.push_back({shape.levels + i, i == 0 ? SeriesKind::bias : SeriesKind::dark, 1,
                                    1e-5 * top * normal(random), 1e-5 * top});
  return curves;
}

inline Characterization made_up_result(const MadeUp& shape = {}) {
  std::mt19937_64 random(7);
  Characterization result;
  result.program_version = "0.1.0";
  result.created = "2026-11-24T10:00:00Z";
  result.acquired = "2026-11-24T09:30:00Z";
  result.session.file = "session.toml";
  result.session.camera = {{"label", std::string("bay 3 camera")},
                           {"serial", std::string("BAY3-01")},
                           {"bit_depth", std::int64_t{12}},
                           {"pixel_pitch_um", 6.5}};
  result.session.light = {{"wavelength_nm", std::int64_t{530}}};
  result.session.analysis = {{"gain_model", std::string("auto")}};
  for (int r = 0; r < shape.regions; ++r) {
    const std::string name = shape.regions == 1 ? "whole" : "amplifier " + std::to_string(r + 1);
    result.regions.push_back({name, {r * 512, 0, 512, 1024}});
    result.curves.push_back(made_up_curves(name, shape, random));
    const auto add = [&](const char* quantity, std::optional<double> value,
                         std::optional<double> uncertainty) {
      Quantity q;
      q.name = quantity;
      q.region = name;
      q.value = value;
      q.standard_uncertainty = q.statistical_uncertainty = uncertainty;
      if (uncertainty) q.common_uncertainty = 0;
      if (value && uncertainty) q.low95 = *value - 2 * *uncertainty, q.high95 = *value + 2 * *uncertainty;
      q.method = value ? "weighted line over 9 levels" : "";
      q.note = value ? "" : "needs dark series of two exposures";
      result.quantities.push_back(q);
    };
    add("conversion_gain_dn_per_e", 0.46043, 0.0021);
    add("conversion_gain_e_per_dn", 2.1719, 0.0099);
    add("dark_offset_dn", 100.031, 0.012);
    add("read_noise_dn", 1.1534, 0.0031);
    add("read_noise_e", 2.505, 0.013);
    add("saturation_dn", 3648, {});
    add("saturation_capacity_e", 7923.1, 36);
    add("prnu_percent", 0.4127, 0.0011);
    add("dark_current_dn_per_s", {}, {});
    add("dark_current_e_per_s", 2.18e-5, 3.1e-6);
    for (int i = 0; i < shape.levels; ++i) {
      SeriesResult s;
      s.conditions.exposure_s = 0.02 * (i + 1) / shape.levels;
      s.region = name;
      s.frames = shape.frames_per_series;
      s.pixels = 512 * 1024;
      s.mean_dn = 100 + shape.top_dn * (i + 1) / shape.levels;
      s.mean_uncertainty_dn = 0.01;
      s.variance_dn2 = 0.46 * (s.mean_dn - 100) + 1.33;
      s.variance_uncertainty_dn2 = 0.004 * *s.variance_dn2;
      s.flicker_percent = 0.04;
      s.used_in = {"gain", "response"};
      s.files = {"flat_" + std::to_string(i) + "_0.tif", "flat_" + std::to_string(i) + "_1.tif"};
      result.series.push_back(s);
    }
    if (shape.darks) {
      SeriesResult s;
      s.conditions = {SeriesKind::bias, 0.0, 1, -10.0, {}, {}};
      s.region = name;
      s.frames = 2 * shape.frames_per_series;
      s.pixels = 512 * 1024;
      s.mean_dn = 100.031;
      s.variance_dn2 = 1.33;
      s.files = {"bias.tif"};
      result.series.push_back(s);
    }
  }
  result.correlations = {{"conversion_gain_dn_per_e", "read_noise_e"}, {{1, -0.8}, {-0.8, 1}}};
  result.findings = {{"bit-depth-inferred",
                      Severity::info,
                      "The largest code is 4095, so 12 bits were taken.",
                      {},
                      {},
                      {{"largest_code_dn", 4095}}},
                     {"light-drift",
                      Severity::caution,
                      "The light of series 3 fell by 0.2 %; each frame was scaled. Let the lamp warm up.",
                      {3},
                      {"conversion_gain_dn_per_e"},
                      {{"drift_percent", -0.2}}},
                     {"too-few-levels",
                      Severity::problem,
                      "One dark exposure: dark current needs two.",
                      {},
                      {"dark_current_dn_per_s"},
                      {}}};
  for (int i = 0; i < shape.levels; ++i)
    result.frames.push_back(
        {"flat_" + std::to_string(i) + ".tif", 1, SeriesKind::flat, "0123456789abcdef0123456789abcdef"});
  return result;
}

}  // namespace evenfield
