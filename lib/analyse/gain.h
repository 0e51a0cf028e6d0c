#pragma once
/// Conversion gain and read noise of one region, with the block jackknife that gives both their uncertainty:
/// they share darks, and read noise in electrons shares the gain.
///
/// Gain: V - (V_dark(t) - V_dark(t0)) = V_dark(t0) + K x over the unsaturated levels of up to 70 % of the
/// range top, by maximum likelihood, the dark level at the shortest exposure t0 included as a point (METHODS
/// of photon transfer: Janesick 2007; weights: model/variance_line.h). Origin line: V - V_dark = K x,
/// unweighted, as EMVA 1288 draws it (from memory). Curved model: the exponential form of
/// model/variance_curve.h through the same points. Lag-summed: the line again, with the covariances of the
/// eight neighbours added to each variance (charge that pixels share leaves the sum as Poisson as it was;
/// METHODS 7.4). The headline is the line's gain, or the curved model's where the session file asks for it or
/// curvature is significant and the covariances account for it. Read noise: darks of the shortest exposure if
/// dark current is below 5 % of their variance, else extrapolated to zero exposure; quantization step^2/12
/// taken out.

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "analyse/levels.h"
#include "analyse/quantities.h"
#include "model/variance_curve.h"

namespace evenfield {

struct GainAndNoise {
  std::optional<Estimate> gain;         ///< DN/e-, the headline
  bool curved = false;                  ///< the headline is the curved model's
  std::optional<Estimate> line_gain;    ///< DN/e-, maximum-likelihood line
  std::optional<Estimate> origin_gain;  ///< DN/e-
  std::optional<Estimate> curved_gain;  ///< DN/e-, at low signal
  std::optional<Estimate> curvature;    ///< 1/e-
  std::optional<Estimate> lag_gain;     ///< DN/e-
  std::optional<VarianceCurve> curve;
  std::optional<Estimate> read_noise_dn;
  std::optional<Estimate> read_noise_e;
  std::optional<double> read_noise_high95_dn;  ///< where noise is hidden by the step of the codes
  std::string gain_reason, read_noise_reason;  ///< why there is none
  std::string curve_reason, lag_reason;
  std::string gain_note, gain_model_note, read_noise_method, read_noise_note;
  std::vector<std::size_t> gain_levels;  ///< indices into RegionLevels::levels()
  std::vector<std::size_t> lag_levels;   ///< of them, those whose neighbours are looked at
  double line_intercept_dn2 = 0;
  SeriesWeights reference_dark;           ///< V_dark(t0)
  SeriesWeights noise_dark;               ///< the darks behind read noise
  std::optional<double> read_exposure_s;  ///< exposure of the darks behind read noise; 0 if extrapolated
  double origin_disagreement = 0;  ///< origin line less line, in standard uncertainties of the difference
  Correlations correlations;       ///< of all these, by the names of their quantities

  /// Between two quantities; absent if one of them is not there.
  std::optional<double> correlation(std::string_view a, std::string_view b) const;
};

GainAndNoise find_gain_and_noise(const RegionLevels& levels);

}  // namespace evenfield
