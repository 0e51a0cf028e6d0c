#include "analyse/findings.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

#include "base/text.h"
#include "model/quantization.h"
#include "model/student.h"

namespace evenfield {
namespace {

/// EMVA 1288 asks for several levels in the range of the linearity error; nine is what its Release 3.1 names
/// (from memory).
constexpr std::size_t kLinearityLevels = 9;
/// Dark current that a camera may have unseen (common practice, no source): what sets the grade of an
/// unmatched dark.
constexpr double kUnseenDarkCurrent_e_per_s = 10.0;

void add(std::vector<Finding>& out, Finding finding) { out.push_back(std::move(finding)); }

std::string counted(std::size_t number, const std::string& one, const std::string& many) {
  return std::to_string(number) + " " + (number == 1 ? one : many);
}

/// Frames that hold one code in most places can be alike without being copies.
bool may_be_alike(const SeriesInput& series, const Codes& codes) {
  for (const RegionSummary& region : series.regions) {
    double at_top = 0;
    for (const Extreme& highest : region.block_highest)
      if (codes.top_code && highest.code == *codes.top_code) at_top += static_cast<double>(highest.count);
    const bool saturated = at_top > 0.5 * region.pixels * region.frames;
    if (!saturated && region.lowest.code != region.highest.code) return false;
  }
  return true;
}

void copies(const AnalysisInput& input, const Codes& codes, std::vector<Finding>& out) {
  std::map<std::string, std::vector<int>> where;
  const int regions = static_cast<int>(input.regions.size());
  for (std::size_t s = 0; s < input.series.size(); ++s) {
    if (may_be_alike(input.series[s], codes)) continue;
    for (const std::string& print : input.series[s].fingerprints) where[print].push_back(static_cast<int>(s));
  }
  int extra = 0;
  std::set<int> series;
  for (const auto& [print, owners] : where) {
    if (owners.size() < 2) continue;
    extra += static_cast<int>(owners.size()) - 1;
    for (const int s : owners) series.insert(s * regions);
  }
  if (extra == 0) return;
  add(out, {"duplicate-frames",
            Severity::problem,
            counted(static_cast<std::size_t>(extra), "frame is a copy of another frame",
                    "frames are copies of other frames") +
                ", pixel for pixel. A copy has no noise of its own: variances come "
                "out too small, and gain and read noise with them. Remove the copies and measure again.",
            {series.begin(), series.end()},
            {"conversion_gain_dn_per_e", "read_noise_e", "read_noise_dn"},
            {{"copies", extra}}});
}

}  // namespace

std::vector<Finding> session_findings(const AnalysisInput& input, const Codes& codes) {
  std::vector<Finding> out;
  const bool flats = std::any_of(input.series.begin(), input.series.end(),
                                 [](const SeriesInput& s) { return s.conditions.kind == SeriesKind::flat; });
  if (codes.inferred_bit_depth && flats) {
    const bool contradicted = input.bit_depth.has_value();
    std::string message = contradicted ? "The frames hold codes that a converter of " +
                                             std::to_string(*input.bit_depth) + " bits cannot give. "
                                       : std::string("The session does not state camera.bit_depth. ");
    message += std::to_string(*codes.inferred_bit_depth) + " bits were inferred from the codes that occur";
    message += codes.plateau ? "; saturation was told from the frames and does not depend on it."
                             : "; saturation is told by it where no frame saturates. State camera.bit_depth.";
    add(out, {"bit-depth-inferred",
              contradicted ? Severity::caution : Severity::info,
              message,
              {},
              {"saturation_dn", "saturation_capacity_e"},
              {{"bit_depth", *codes.inferred_bit_depth}, {"step_dn", codes.step_dn}}});
  }
  if (input.floating && codes.step_dn == 0)
    add(out, {"coarse-quantization",
              Severity::info,
              "The pixels are floating-point numbers without a step, so that no quantization noise is taken "
              "out of the read noise.",
              {},
              {"read_noise_dn", "read_noise_e"},
              {{"step_dn", 0.0}}});
  copies(input, codes, out);
  return out;
}

namespace {

void noise_findings(const RegionLevels& levels, const std::vector<int>& rows, std::vector<Finding>& out) {
  const double step = levels.codes().step_dn;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s) {
    const RegionSummary& summary = levels.summary(s);
    if (levels.input().series[s].conditions.kind == SeriesKind::flat || !summary.variance) continue;
    const double variance = *summary.variance;
    if (variance <= 0) {
      add(out,
          {"zero-noise",
           Severity::problem,
           "A dark series" + in_region(levels) +
               " has no temporal noise at all (every frame holds the same numbers), which no camera "
               "does. Read noise and gain cannot rest on it. Replace it by frames that were really read out.",
           {rows[s]},
           {"read_noise_dn", "read_noise_e", "conversion_gain_dn_per_e"},
           {{"variance_dn2", variance}}});
    } else if (step > 0 && variance < kCoarseVariance * step * step) {
      const bool unresolved = variance < kUnresolvedVariance * step * step;
      add(out, {"coarse-quantization",
                unresolved ? Severity::problem : Severity::caution,
                "The dark noise" + in_region(levels) + " is " + to_text(std::sqrt(variance) / step, 3) +
                    " steps of the converter. Rounding then hides or distorts it (resolved from 0.49 steps "
                    "on, safe from 0.67). Use a "
                    "higher gain setting of the camera to measure read noise.",
                {rows[s]},
                {"read_noise_dn", "read_noise_e", "dsnu_dn", "dsnu_e", "conversion_gain_dn_per_e"},
                {{"variance_dn2", variance}, {"step_dn", step}}});
    }
  }
}

void frame_findings(const RegionLevels& levels, const std::vector<int>& rows, std::vector<Finding>& out) {
  std::vector<int> single;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s)
    if (levels.summary(s).frames < 2) single.push_back(rows[s]);
  if (!single.empty()) {
    bool all = single.size() == levels.input().series.size();
    add(out, {"too-few-frames",
              all ? Severity::problem : Severity::caution,
              counted(single.size(), "series has", "series have") + " one frame each" + in_region(levels) +
                  ". One frame does not tell noise from pattern: these series take no part in gain, noise, "
                  "DSNU and PRNU. "
                  "Take two frames or more of each level, and sixteen or more darks.",
              single,
              {"conversion_gain_dn_per_e", "read_noise_e", "dsnu_e", "prnu_percent"},
              {{"series", static_cast<double>(single.size())}}});
  }
}

void level_findings(const RegionLevels& levels,
                    const GainAndNoise& gain,
                    const Response& response,
                    const std::vector<int>& rows,
                    std::vector<Finding>& out) {
  if (levels.levels().empty()) return;
  std::vector<int> saturated;
  for (const Level& level : levels.levels())
    if (levels.saturated(level)) saturated.push_back(rows[level.series]);
  std::sort(saturated.begin(), saturated.end());
  if (!saturated.empty())
    add(out,
        {"saturated",
         Severity::info,
         counted(saturated.size(), "light level has", "light levels have") +
             " more than 0.2 % of the pixels at the top code" + in_region(levels) +
             ". Such levels tell where saturation is and take part in nothing else.",
         saturated,
         {"saturation_dn"},
         {{"top_code_dn", *levels.codes().top_code}, {"levels", static_cast<double>(saturated.size())}}});
  if (!gain.gain)
    add(out, {"too-few-levels",
              Severity::problem,
              "The gain" + in_region(levels) + " could not be had: " + gain.gain_reason +
                  ". Numbers in electrons are missing with it. Take levels from dark to past saturation, two "
                  "frames "
                  "or more of each.",
              {},
              {"conversion_gain_dn_per_e", "read_noise_e", "saturation_capacity_e", "dynamic_range_ratio"},
              {{"levels", static_cast<double>(levels.levels().size())}}});
  std::set<double> axes;
  for (const std::size_t i : response.levels) axes.insert(*axis_of(levels, levels.levels()[i]));
  std::set<double> gain_signals;
  for (const std::size_t i : gain.gain_levels) gain_signals.insert(levels.levels()[i].signal);
  if (gain.gain && gain_signals.size() < 3)
    add(out, {"too-few-levels",
              Severity::caution,
              "The gain" + in_region(levels) + " rests on " + std::to_string(gain_signals.size()) +
                  " light level" + (gain_signals.size() == 1 ? "" : "s") +
                  " and the dark: a curved relation cannot be seen, nor can linearity and saturation be had. "
                  "Take twelve levels or more from dark to past saturation.",
              {},
              {"conversion_gain_dn_per_e", "linearity_error_percent", "saturation_capacity_e"},
              {{"levels", static_cast<double>(gain_signals.size())}}});
  else if (response.line && axes.size() < kLinearityLevels)
    add(out, {"too-few-levels",
              Severity::info,
              "The linearity error" + in_region(levels) + " rests on " + std::to_string(axes.size()) +
                  " light levels between 5 and 95 % of the range; nine or more show where it bends.",
              {},
              {"linearity_error_percent"},
              {{"levels", static_cast<double>(axes.size())}}});
}

void dark_findings(const RegionLevels& levels,
                   const GainAndNoise& gain,
                   const std::vector<int>& rows,
                   std::vector<Finding>& out) {
  std::vector<int> none;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s)
    if (levels.input().series[s].conditions.kind == SeriesKind::flat &&
        match_dark(levels.input(), levels.region(), levels.input().series[s].conditions).mean.empty())
      none.push_back(rows[s]);
  if (!none.empty())
    add(out, {"unmatched-dark",
              Severity::problem,
              counted(none.size(), "flat series has", "flat series have") +
                  " no dark of the same settings (em_gain, control_v, temperature within 1 K)" +
                  in_region(levels) + " and took no part. Take darks with those settings.",
              none,
              {"conversion_gain_dn_per_e", "linearity_error_percent", "prnu_percent"},
              {{"series", static_cast<double>(none.size())}}});

  std::vector<int> series;
  double worst_s = 0;
  double worst_percent = 0;
  bool extrapolated = false;
  for (const Level& level : levels.levels()) {
    const double difference = level.dark.exposure_difference_s;
    if (difference == 0 && !level.dark.extrapolated) continue;
    series.push_back(rows[level.series]);
    extrapolated = extrapolated || level.dark.extrapolated;
    if (level.dark.extrapolated && level.signal > 0) {
      double uncertainty = 0;
      for (const auto& [s, weight] : level.dark.mean)
        uncertainty += std::pow(weight * levels.mean_uncertainty(s), 2);
      worst_percent = std::max(worst_percent, 100 * std::sqrt(uncertainty) / level.signal);
    }
    if (difference == 0 || level.signal <= 0) continue;
    if (std::abs(difference) > std::abs(worst_s)) worst_s = difference;
    if (gain.gain && !levels.saturated(level))
      worst_percent = std::max(worst_percent, 100 * kUnseenDarkCurrent_e_per_s * std::abs(difference) *
                                                  gain.gain->value / level.signal);
  }
  if (series.empty()) return;
  const bool matters = worst_percent > 1.0;
  std::string message =
      worst_s != 0
          ? "Darks of one exposure serve flats of others" + in_region(levels) + ", up to " +
                to_text(worst_s, 3) + " s away. " +
                (worst_percent > 0
                     ? "A dark current of " + to_text(kUnseenDarkCurrent_e_per_s, 3) +
                           " e-/s would change the signal by up to " + to_text(worst_percent, 2) + " %. "
                     : "What dark current does in that time is not known. ") +
                "Take darks at the flats' exposures."
          : "Some flats" + in_region(levels) +
                " have exposures outside those of the darks; the dark level there was extrapolated, with an "
                "uncertainty of up to " +
                to_text(worst_percent, 2) + " % of the signal. Take darks at the flats' exposures.";
  add(out, {"unmatched-dark",
            matters ? Severity::caution : Severity::info,
            message,
            series,
            {"conversion_gain_dn_per_e", "linearity_error_percent", "prnu_percent"},
            {{"exposure_difference_s", worst_s}, {"signal_change_percent", worst_percent}}});
}

/// Signals below their dark: the darks saw light, or flats and darks were not taken alike.
void leak_findings(const RegionLevels& levels, const std::vector<int>& rows, std::vector<Finding>& out) {
  std::vector<int> series;
  double worst = 0;
  for (const Level& level : levels.levels()) {
    const double dark =
        std::abs(levels.input().series[level.series].regions[levels.region()].mean - level.signal);
    double uncertainty = std::pow(levels.mean_uncertainty(level.series), 2);
    for (const auto& [s, weight] : level.dark.mean)
      uncertainty += std::pow(weight * levels.mean_uncertainty(s), 2);
    // Six standard uncertainties, and a thousandth of the dark level for what regulates it.
    if (level.signal >= 0 || level.signal > -6 * std::sqrt(uncertainty) - 0.001 * dark) continue;
    series.push_back(rows[level.series]);
    worst = std::min(worst, level.signal);
  }
  if (series.empty()) return;
  std::sort(series.begin(), series.end());
  add(out, {"light-leak",
            Severity::problem,
            counted(series.size(), "flat series is", "flat series are") + " darker than the matching darks" +
                in_region(levels) + ", by up to " + to_text(-worst, 4) +
                " DN. The darks saw light, or the dark level differs between them and the flats; every "
                "signal is then off by as much. "
                "Take darks again with the light shut out and all settings as for the flats.",
            series,
            {"conversion_gain_dn_per_e", "linearity_error_percent", "saturation_dn", "dark_offset_dn",
             "prnu_percent"},
            {{"lowest_signal_dn", worst}}});
}

/// Darks whose noise is cut off at the top code.
void top_clipping_findings(const RegionLevels& levels,
                           const std::vector<int>& rows,
                           std::vector<Finding>& out) {
  if (!levels.codes().top_code) return;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s) {
    if (levels.input().series[s].conditions.kind == SeriesKind::flat) continue;
    const double percent = 100 * levels.saturated_share(levels.summary(s));
    // As at the lowest code; hot pixels of long darks are fewer.
    constexpr double kSeen_percent = 0.5;
    if (percent < kSeen_percent) continue;
    add(out,
        {"clipped-dark",
         Severity::problem,
         to_text(percent, 3) + " % of a dark series' samples" + in_region(levels) + " show the top code, " +
             to_text(*levels.codes().top_code, 7) +
             " DN. Their noise is cut off: read noise and dark offset come out too small. Lower the camera's "
             "offset or the exposure, or shut the light out.",
         {rows[s]},
         {"read_noise_dn", "read_noise_e", "dark_offset_dn", "dsnu_dn", "dsnu_e", "conversion_gain_dn_per_e"},
         {{"clipped_percent", percent}}});
  }
}

/// Darks whose noise is cut off at the lowest code.
void clipping_findings(const RegionLevels& levels, const std::vector<int>& rows, std::vector<Finding>& out) {
  // The lowest code of an unsigned converter; where anything lies below zero, zero is a code like others.
  for (const SeriesInput& series : levels.input().series)
    if (series.regions[levels.region()].lowest.code < 0) return;
  for (std::size_t s = 0; s < levels.input().series.size(); ++s) {
    const RegionSummary& summary = levels.summary(s);
    if (levels.input().series[s].conditions.kind == SeriesKind::flat || summary.lowest.code != 0 ||
        !summary.variance || *summary.variance <= 0)
      continue;
    const double percent =
        100 * static_cast<double>(summary.lowest.count) / (summary.pixels * summary.frames);
    // 0.2 % begins to show in the variance; 0.5 % is what EMVA 1288 allows (from memory).
    if (percent < 0.2) continue;
    add(out,
        {"clipped-dark",
         percent > 0.5 ? Severity::problem : Severity::caution,
         to_text(percent, 3) + " % of a dark series' pixels" + in_region(levels) +
             " show the code 0, below which the converter cannot go. Their noise is cut off: read noise "
             "comes out too small, the dark offset too large, and the gain is "
             "drawn along. Raise the camera's offset.",
         {rows[s]},
         {"read_noise_dn", "read_noise_e", "dark_offset_dn", "dsnu_dn", "dsnu_e", "conversion_gain_dn_per_e"},
         {{"clipped_percent", percent}}});
  }
}

void shape_findings(const RegionLevels& levels, const GainAndNoise& gain, std::vector<Finding>& out) {
  if (!gain.gain || !gain.origin_gain) return;
  const double percent = 100 * (gain.origin_gain->value / gain.gain->value - 1);
  constexpr double kSignificant = 5;
  constexpr double kMatters_percent = 2;
  if (std::abs(gain.origin_disagreement) < kSignificant || std::abs(percent) < kMatters_percent) return;
  add(out,
      {"nonlinear",
       Severity::caution,
       "The temporal variance" + in_region(levels) +
           " does not rise on a straight line with the signal: the line through the origin is " +
           to_text(percent, 2) + " % off the best line (" + to_text(std::abs(gain.origin_disagreement), 2) +
           " standard uncertainties). A bent response, charge shared between pixels, or darks that "
           "do not belong to the flats do this. The gain holds for the low signals at best.",
       {},
       {"conversion_gain_dn_per_e", "conversion_gain_origin_line_dn_per_e", "read_noise_e"},
       {{"difference_percent", percent}, {"standard_uncertainties", gain.origin_disagreement}}});
}

void drift_findings(const RegionLevels& levels, const std::vector<int>& rows, std::vector<Finding>& out) {
  if (levels.flicker_dof() <= 0) return;
  const double percent = 100 * levels.flicker();
  std::vector<int> series;
  for (const Level& level : levels.levels())
    if (levels.summary(level.series).scaled && !levels.saturated(level)) series.push_back(rows[level.series]);
  // Light that scatters by less leaves the linearity error in peace; the scatter is taken out of all
  // variances.
  constexpr double kSeen_percent = 0.2;
  constexpr double kTouches_percent = 1.0;
  if (percent < kSeen_percent) return;
  const bool touches = percent > kTouches_percent;
  add(out, {"light-drift",
            touches ? Severity::caution : Severity::info,
            "The light" + in_region(levels) + " changes by " + to_text(percent, 2) +
                " % (rms) from frame to frame. It was scaled out of the variances; means, and with them the "
                "linearity error, keep their share. "
                "Let the source warm up, or take more frames of each level.",
            series,
            {"linearity_error_percent", "prnu_percent"},
            {{"flicker_percent", percent}}});
}

}  // namespace

std::vector<Finding> region_findings(const RegionLevels& levels,
                                     const GainAndNoise& gain,
                                     const Response& response,
                                     const std::vector<int>& rows) {
  std::vector<Finding> out;
  noise_findings(levels, rows, out);
  frame_findings(levels, rows, out);
  level_findings(levels, gain, response, rows, out);
  dark_findings(levels, gain, rows, out);
  leak_findings(levels, rows, out);
  clipping_findings(levels, rows, out);
  top_clipping_findings(levels, rows, out);
  shape_findings(levels, gain, out);
  drift_findings(levels, rows, out);
  return out;
}

}  // namespace evenfield
