#pragma once
/// Conversion gain and read noise of one region, with the block jackknife that gives both their uncertainty:
/// they share darks, and read noise in electrons shares the gain.
///
/// Gain: V - (V_dark(t) - V_dark(t0)) = V_dark(t0) + K x over the unsaturated levels of up to 70 % of the
/// range top, by maximum likelihood, the dark level at the shortest exposure t0 included as a point (METHODS
/// of photon transfer: Janesick 2007; weights: model/variance_line.h). Origin line: V - V_dark = K x,
/// unweighted, as EMVA 1288 draws it (from memory). Read noise: darks of the shortest exposure if dark
/// current is below 5 % of their variance, else extrapolated to zero exposure; quantization step^2/12 taken
/// out.

#include <optional>
#include <string>
#include <vector>

#include "analyse/levels.h"
#include "analyse/quantities.h"

namespace evenfield {

struct GainAndNoise {
  std::optional<Estimate> gain;         ///< DN/e-, maximum-likelihood line
  std::optional<Estimate> origin_gain;  ///< DN/e-
  std::optional<Estimate> read_noise_dn;
  std::optional<Estimate> read_noise_e;
  std::optional<double> read_noise_high95_dn;  ///< where noise is hidden by the step of the codes
  std::string gain_reason, read_noise_reason;  ///< why there is none
  std::string gain_note, read_noise_method, read_noise_note;
  std::vector<std::size_t> gain_levels;  ///< indices into RegionLevels::levels()
  double line_intercept_dn2 = 0;
  SeriesWeights reference_dark;           ///< V_dark(t0)
  std::optional<double> read_exposure_s;  ///< exposure of the darks behind read noise; 0 if extrapolated
  double origin_disagreement = 0;  ///< origin line less line, in standard uncertainties of the difference
  Correlations correlations;       ///< of gain, its inverse, origin gain and read noise
};

GainAndNoise find_gain_and_noise(const RegionLevels& levels);

}  // namespace evenfield
