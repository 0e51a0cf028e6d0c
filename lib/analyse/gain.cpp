#include "analyse/gain.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "analyse/gain_plan.h"
#include "analyse/gain_problem.h"
#include "base/text.h"
#include "model/gum.h"
#include "model/jackknife.h"
#include "model/quantization.h"

namespace evenfield {
namespace {

/// The headline may follow the curved model where its curvature is this many standard uncertainties from 0.
constexpr double kSignificantCurvature = 5;
/// Which model the headline follows, and why.
bool follows_curve(const RegionLevels& levels,
                   const WholeFits& fits,
                   double curvature_uncertainty,
                   GainAndNoise& out) {
  const GainModel wanted = levels.input().gain_model;
  if (!fits.curve) {
    if (wanted == GainModel::curved)
      out.gain_model_note = "the curved model was asked for and could not be fitted; this is the line's";
    return false;
  }
  if (wanted == GainModel::curved) {
    out.gain_model_note = "curved model, as the session file asks";
    return true;
  }
  const double significance = std::abs(fits.curve->curvature) / curvature_uncertainty;
  if (wanted == GainModel::line || !(significance >= kSignificantCurvature)) return false;
  // Charge that pixels share moves variance into covariances, and the sum of both is straight again; a bent
  // response stays bent.
  bool accounted = false;
  if (fits.lag_curve) {
    // Is what is left nearer to nothing than to the whole curvature?
    const double left = fits.lag_curve->curvature;
    accounted = left / fits.curve->curvature < 0.5 ||
                std::abs(left) < 2 * std::sqrt(fits.lag_curve->covariance(2, 2));
  }
  const std::string seen =
      "the relation is curved by " + to_text(significance, 2) + " standard uncertainties";
  out.gain_model_note = seen + (accounted ? ", and neighbours' covariances account for it: curved model"
                                          : ", which neighbours' covariances do not account for: the line "
                                            "heads the list, and the response should be looked at");
  return accounted;
}

/// What cannot be trusted is no statistic.
void drop_unresolved_noise(const RegionLevels& levels,
                           const SeriesWeights& noise_dark,
                           Statistics& whole,
                           GainAndNoise& out) {
  if (noise_dark.empty()) return;
  const double step = levels.codes().step_dn;
  const double variance = levels.dark_variance(noise_dark);
  if (variance > kUnresolvedVariance * step * step && whole[kNoiseDn]) return;
  out.read_noise_reason =
      variance <= 0
          ? "the darks show no noise at all; frames that were never read out look like this"
          : "the step of the codes hides the noise; the upper limit is that of EMVA 1288 (from memory)";
  if (variance > 0) out.read_noise_high95_dn = unresolved_noise_limit(step);
  whole[kNoiseDn].reset();
}

/// The estimates of all statistics that exist, from their values with each unit left out.
void put_estimates(const Statistics& whole,
                   const std::vector<int>& present,
                   const Jackknife& resampled,
                   GainAndNoise& out) {
  const std::array<std::optional<Estimate>*, kStatistics> targets{
      &out.line_gain,     &out.origin_gain, &out.curved_gain, &out.curvature,   &out.lag_gain,
      &out.read_noise_dn, &out.gain,        nullptr,          &out.read_noise_e};
  for (std::size_t k = 0; k < present.size(); ++k) {
    const int column = static_cast<int>(k);
    const auto statistic = static_cast<std::size_t>(present[k]);
    out.correlations.names.emplace_back(kNames[statistic]);
    if (targets[statistic] != nullptr)
      *targets[statistic] = Estimate{*whole[statistic], std::sqrt(resampled.covariance(column, column)), 0.0,
                                     resampled.degrees_of_freedom};
  }
  const Matrix correlation = correlation_of(resampled.covariance);
  for (int i = 0; i < correlation.rows; ++i) {
    std::vector<double> row;
    for (int j = 0; j < correlation.columns; ++j) row.push_back(correlation(i, j));
    out.correlations.matrix.push_back(std::move(row));
  }
}

}  // namespace

std::optional<double> GainAndNoise::correlation(std::string_view a, std::string_view b) const {
  const auto place = [&](std::string_view name) {
    return static_cast<std::size_t>(std::find(correlations.names.begin(), correlations.names.end(), name) -
                                    correlations.names.begin());
  };
  const std::size_t i = place(a);
  const std::size_t j = place(b);
  if (i >= correlations.names.size() || j >= correlations.names.size()) return std::nullopt;
  return correlations.matrix[i][j];
}

GainAndNoise find_gain_and_noise(const RegionLevels& levels) {
  GainAndNoise out;
  plan_gain(levels, out);
  WholeFits fits;
  Statistics whole = GainProblem(levels, out, {}, ResamplingUnit::blocks).whole(fits);
  out.noise_dark = plan_noise(levels, whole[kLine].value_or(0.0), out);

  std::vector<std::size_t> used;
  for (const std::size_t index : out.gain_levels) used.push_back(levels.levels()[index].series);
  for (const auto& [series, weight] : out.noise_dark) used.push_back(series);
  const ResamplingUnit unit =
      rows_are_correlated(levels, used) ? ResamplingUnit::bands : ResamplingUnit::blocks;

  GainProblem problem(levels, out, out.noise_dark, unit);
  whole = problem.whole(fits);
  if (fits.line) out.line_intercept_dn2 = fits.line->intercept;
  if (fits.curve) out.curve = *fits.curve;
  if (!whole[kLine] && out.gain_reason.empty())
    out.gain_reason = "the temporal variance does not rise with the signal";
  if (!whole[kLagSummed] && out.lag_reason.empty())
    out.lag_reason = "no line fits the variance with the covariances of neighbours";
  if (!fits.curve)
    out.curve_reason =
        "needs " + std::to_string(kCurveLevels) + " light levels or more up to 70 % of the range top";
  drop_unresolved_noise(levels, out.noise_dark, whole, out);

  std::vector<int> present;
  for (int k = 0; k < kComputed; ++k)
    if (whole[static_cast<std::size_t>(k)]) present.push_back(k);
  if (used.empty() || present.empty()) return out;
  const int units = unit_count(levels.summary(used.front()), unit);
  const auto give_up = [&](const std::string& reason) {
    if (whole[kLine]) out.gain_reason = reason;
    if (whole[kNoiseDn]) out.read_noise_reason = reason;
    return out;
  };
  if (units < 2) return give_up("the region is too small for an uncertainty: it has one block");
  std::vector<Statistics> left_out;
  int lag_failures = 0;
  double curvature_square = 0;
  double curvature_sum = 0;
  for (int u = 0; u < units; ++u) {
    left_out.push_back(problem.without(u, fits));
    if (whole[kLagSummed] && !left_out.back()[kLagSummed]) ++lag_failures;
    for (const int k : present)
      if (auto& value = left_out.back()[static_cast<std::size_t>(k)]; !value)
        value = whole[static_cast<std::size_t>(k)];
    if (!whole[kCurvature]) continue;
    const double moved = *left_out.back()[kCurvature] - *whole[kCurvature];
    curvature_sum += moved;
    curvature_square += moved * moved;
  }
  if (lag_failures > 0) {
    whole[kLagSummed].reset();
    std::erase(present, static_cast<int>(kLagSummed));
    out.lag_reason = "the region has too few pixels for the covariances of neighbours";
  }
  const double curvature_uncertainty =
      std::sqrt((units - 1.0) / units * (curvature_square - curvature_sum * curvature_sum / units));
  out.curved = follows_curve(levels, fits, curvature_uncertainty, out);
  follow(whole, out.curved);
  for (Statistics& values : left_out) follow(values, out.curved);
  for (int k = kComputed; k < kStatistics; ++k)
    if (whole[static_cast<std::size_t>(k)]) present.push_back(k);

  Matrix values(units, static_cast<int>(present.size()));
  for (int u = 0; u < units; ++u)
    for (std::size_t k = 0; k < present.size(); ++k)
      values(u, static_cast<int>(k)) =
          left_out[static_cast<std::size_t>(u)][static_cast<std::size_t>(present[k])].value_or(
              *whole[static_cast<std::size_t>(present[k])]);
  const auto resampled = jackknife(values);
  if (!resampled) return give_up("no uncertainty could be had: " + resampled.error().what);
  put_estimates(whole, present, *resampled, out);
  if (out.gain && out.gain->statistical_uncertainty <= 0) {
    for (std::optional<Estimate>* each : {&out.gain, &out.line_gain, &out.origin_gain, &out.curved_gain,
                                          &out.curvature, &out.lag_gain, &out.read_noise_e})
      each->reset();
    out.gain_reason = "the frames show no noise of their own, so nothing is known of the uncertainty";
  }
  if (out.line_gain && out.origin_gain) {
    const double a = out.line_gain->statistical_uncertainty;
    const double b = out.origin_gain->statistical_uncertainty;
    const double variance =
        a * a + b * b - 2 * a * b * out.correlation(kNames[kLine], kNames[kOrigin]).value_or(0.0);
    if (variance > 0)
      out.origin_disagreement = (out.origin_gain->value - out.line_gain->value) / std::sqrt(variance);
  }
  out.gain_note = unit == ResamplingUnit::bands ? "rows share noise, so bands of rows were resampled" : "";
  return out;
}

}  // namespace evenfield
