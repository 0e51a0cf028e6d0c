#include "analyse/data_sheet_findings.h"

#include <algorithm>
#include <cmath>

#include "analyse/resampling.h"
#include "base/text.h"

namespace evenfield {
namespace {

/// Standard uncertainties from which on something is called seen: less than 1e-6 of clean sessions by chance.
constexpr double kSeen = 5.0;

void range_findings(const RegionLevels& levels, const FullWell& well, std::vector<Finding>& out) {
  if (!well.converter_limited) return;
  out.push_back({"converter-limited",
                 Severity::info,
                 "Pixels" + in_region(levels) +
                     " reach the top code before their charge ends: the variance is largest at " +
                     to_text(*well.variance_maximum_dn, 5) +
                     " DN and falls where codes are cut off. Saturation capacity holds; the full well lies "
                     "higher and was "
                     "left out. Lower the camera's gain if it is wanted.",
                 {},
                 {"full_well_e"},
                 {{"variance_maximum_dn", *well.variance_maximum_dn}}});
}

/// Photon noise of neighbours: covariances of flats less those of the darks, over the photon variance.
void neighbour_findings(const RegionLevels& levels,
                        const GainAndNoise& gain,
                        const std::vector<int>& rows,
                        std::vector<Finding>& out) {
  if (!gain.gain) return;
  double dark_covariance = 0;
  double dark_variance = 0;
  double dark_spread = 0;
  for (const auto& [series, weight] : gain.reference_dark) {
    const UnitSums dark(levels.summary(series), ResamplingUnit::blocks);
    dark_covariance += weight * dark.neighbour_covariance(-1);
    dark_variance += weight * dark.variance(-1);
    dark_spread += weight * weight * 16 * std::pow(dark.variance(-1), 2) / dark.neighbour_pixels(-1);
  }
  double weights = 0;
  double share = 0;
  std::vector<int> series;
  for (const std::size_t i : gain.lag_levels) {
    const Level& level = levels.levels()[i];
    const UnitSums flat(levels.summary(level.series), ResamplingUnit::blocks);
    const double photons = flat.variance(-1) - dark_variance;
    if (!(photons > 0)) continue;
    const double spread =
        (16 * std::pow(flat.variance(-1), 2) / flat.neighbour_pixels(-1) + dark_spread) / (photons * photons);
    share += (flat.neighbour_covariance(-1) - dark_covariance) / photons / spread;
    weights += 1 / spread;
    series.push_back(rows[level.series]);
  }
  if (!(weights > 0)) return;
  const double percent = 100 * share / weights;
  const double uncertainty = 100 / std::sqrt(weights);
  constexpr double kMatters_percent = 1.0;
  if (std::abs(percent) < kSeen * uncertainty || std::abs(percent) < kMatters_percent) return;
  out.push_back({"correlated-noise",
                 Severity::caution,
                 "The eight neighbours of a pixel" + in_region(levels) + " share " + to_text(percent, 3) +
                     " % of its photon noise (standard uncertainty " + to_text(uncertainty, 2) +
                     " %): charge that pixels share, or a filter in the camera. The plain variance, and the "
                     "gain from it, is "
                     "off by as much. Read the lag-summed gain, and switch filters off.",
                 series,
                 {"conversion_gain_dn_per_e", "conversion_gain_e_per_dn",
                  "conversion_gain_lag_summed_dn_per_e", "read_noise_e", "saturation_capacity_e"},
                 {{"shared_percent", percent}, {"shared_uncertainty_percent", uncertainty}}});
}

void offset_findings(const RegionLevels& levels,
                     const GainAndNoise& gain,
                     const DarkCurrent& dark,
                     const std::vector<int>& rows,
                     std::vector<Finding>& out) {
  if (!offset_is_regulated(gain, dark)) return;
  const double k = gain.gain->value;
  const double mean = dark.dn_per_s->value / k;
  const double variance = dark.variance_dn2_per_s->value / (k * k);
  std::vector<int> series;
  for (const std::size_t s : dark.series) series.push_back(rows[s]);
  out.push_back({"offset-regulated",
                 Severity::caution,
                 "The dark level" + in_region(levels) + " grows by " + to_text(mean, 3) +
                     " e-/s and the dark noise as if by " + to_text(variance, 3) +
                     " e-/s: the camera holds its dark level, which hides dark current from the means. The "
                     "dark current from "
                     "means was left out; read the one from variances, or switch the regulation off.",
                 series,
                 {"dark_current_dn_per_s", "dark_current_e_per_s"},
                 {{"from_means_e_per_s", mean}, {"from_variances_e_per_s", variance}}});
}

void light_findings(const RegionLevels& levels, const Efficiency& efficiency, std::vector<Finding>& out) {
  // Photons of more than 3.6 eV (340 nm) may free more than one electron in silicon; silicon sees 190 to 1100
  // nm (common practice, no source).
  constexpr double kOneElectron_nm = 340;
  constexpr double kShortest_nm = 190;
  constexpr double kLongest_nm = 1100;
  const std::vector<std::string> touched{"quantum_efficiency_percent", "responsivity_dn_per_photon",
                                         "absolute_threshold_photons"};
  for (const Level& level : levels.levels()) {
    const auto& wavelength = levels.input().series[level.series].wavelength_nm;
    if (!wavelength || (*wavelength >= kShortest_nm && *wavelength <= kLongest_nm)) continue;
    out.push_back(
        {"wavelength-range",
         Severity::caution,
         "The wavelength of " + to_text(*wavelength, 5) +
             " nm lies outside 190 to 1100 nm, where silicon sees light: check wavelength_nm and its unit.",
         {},
         touched,
         {{"wavelength_nm", *wavelength}}});
    break;
  }
  if (!efficiency.percent || !efficiency.wavelength_nm || *efficiency.wavelength_nm < kOneElectron_nm) return;
  const double percent = efficiency.percent->value;
  const double uncertainty =
      std::hypot(efficiency.percent->statistical_uncertainty, efficiency.percent->common_uncertainty);
  if (percent - 3 * uncertainty <= 100) return;
  out.push_back(
      {"impossible-efficiency",
       Severity::problem,
       "The quantum efficiency" + in_region(levels) + " comes out as " + to_text(percent, 4) +
           " % (standard uncertainty " + to_text(uncertainty, 2) +
           " %), more than every photon. Check the irradiance in the sensor's plane and its unit, the pixel "
           "pitch with binning, wavelength and gain.",
       {},
       touched,
       {{"quantum_efficiency_percent", percent}, {"uncertainty_percent", uncertainty}}});
}

/// Levels so far off a line that no camera but the list of exposures explains it.
void response_findings(const Response& response,
                       const RegionLevels& levels,
                       const std::vector<int>& rows,
                       std::vector<Finding>& out) {
  if (!response.line || !response.error_percent) return;
  // A strongly bent response has an error of 1 or 2 %; forgotten or exchanged exposures have tens (common
  // practice, no source).
  constexpr double kExplained_percent = 4.0;
  const double percent = response.error_percent->value;
  const double uncertainty = response.error_percent->statistical_uncertainty + response.floor_percent;
  if (percent < kExplained_percent || percent < kSeen * uncertainty) return;
  std::vector<int> series;
  double worst = 0;
  for (std::size_t i = 0; i < response.levels.size(); ++i) {
    const double deviation = std::abs(response.line->deviations_percent[i]);
    if (deviation > percent) series.push_back(rows[levels.levels()[response.levels[i]].series]);
    worst = std::max(worst, deviation);
  }
  out.push_back(
      {"exposure-mismatch",
       Severity::problem,
       "The signals" + in_region(levels) + " miss a line against exposure_s x light by " +
           to_text(percent, 3) + " % in the mean and " + to_text(worst, 3) +
           " % at worst: exposures or light levels in the session file are wrong or exchanged, or the light "
           "changed. What rests on them is wrong; gain and noise do not. Check exposure_s and light of the "
           "series "
           "named.",
       series,
       {"linearity_error_percent", "linear_full_well_e", "shutter_offset_s", "responsivity_dn_per_photon",
        "quantum_efficiency_percent", "absolute_threshold_photons"},
       {{"mean_percent", percent}, {"worst_percent", worst}}});
}

}  // namespace

bool offset_is_regulated(const GainAndNoise& gain, const DarkCurrent& dark) {
  if (!gain.gain || !dark.dn_per_s || !dark.variance_dn2_per_s) return false;
  // Both as slopes in DN^2/s. Uneven dark current does not part them; half is far beyond what an imperfect
  // gain does.
  const double mean = dark.dn_per_s->value * gain.gain->value;
  const double variance = dark.variance_dn2_per_s->value;
  const double uncertainty = std::hypot(dark.dn_per_s->statistical_uncertainty * gain.gain->value,
                                        dark.variance_dn2_per_s->statistical_uncertainty);
  return variance - mean > kSeen * uncertainty && mean < 0.5 * variance;
}

std::vector<Finding> data_sheet_findings(const RegionLevels& levels,
                                         const GainAndNoise& gain,
                                         const DarkCurrent& dark,
                                         const Response& response,
                                         const DataSheet& sheet,
                                         const std::vector<int>& rows) {
  std::vector<Finding> out;
  range_findings(levels, sheet.full_well, out);
  response_findings(response, levels, rows, out);
  neighbour_findings(levels, gain, rows, out);
  offset_findings(levels, gain, dark, rows, out);
  light_findings(levels, sheet.efficiency, out);
  return out;
}

}  // namespace evenfield
