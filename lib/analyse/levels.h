#pragma once
/// The light levels of one region: every flat series with its matching dark, its signal, and what it may be
/// used for.

#include <optional>
#include <string>
#include <vector>

#include "analyse/analysis_input.h"
#include "analyse/dark_match.h"
#include "analyse/resampling.h"

namespace evenfield {

/// The codes of the converter, told from all series of the session.
struct Codes {
  double step_dn = 0;  ///< smallest spacing of codes that occur; 0: floating-point data without a step
  std::optional<double> top_code;  ///< the code at which pixels saturate
  std::optional<int>
      inferred_bit_depth;  ///< set where the session does not state one, or states one that is too small
  bool plateau = false;    ///< the top code is the one that most pixels of the brightest series show
};

Codes find_codes(const AnalysisInput& input);

struct Level {
  std::size_t series = 0;
  MatchedDark dark;
  double signal = 0;               ///< mean less dark mean [DN]
  std::optional<double> variance;  ///< temporal [DN^2]
  std::optional<double> dark_variance;
  double saturated_fraction =
      0;  ///< share of pixels at the top code, those that are there without light less
};

/// The upper end of what can be used.
struct RangeTop {
  double signal_dn = 0;  ///< median of blocks at saturation; else the highest level
  bool saturates = false;
  std::string unresolved;     ///< why a saturation that was reached has no value
  double uncertainty_dn = 0;  ///< of a saturation
  double noise_dn = 0;        ///< standard deviation of a pixel there
};

/// Share of pixels at the top code that is called saturation (EMVA 1288 Release 4.0, seen in quotation: 0.1
/// to 0.2 %).
inline constexpr double kSaturatedShare = 0.002;
/// Share of the range top up to which the gain is fitted (EMVA 1288, from memory).
inline constexpr double kGainRange = 0.7;

class RegionLevels {
 public:
  RegionLevels(const AnalysisInput& input, std::size_t region, const Codes& codes);

  const AnalysisInput& input() const { return input_; }
  std::size_t region() const { return region_; }
  const RegionSummary& summary(std::size_t series) const { return input_.series[series].regions[region_]; }
  /// All flats that have a matching dark, by rising signal.
  const std::vector<Level>& levels() const { return levels_; }
  const Codes& codes() const { return codes_; }
  const RangeTop& top() const { return top_; }
  bool saturated(const Level& level) const;
  /// Share of pixels at the top code, mean over frames.
  double saturated_share(const RegionSummary& summary) const;

  /// Weighted sums over dark series of this region.
  double dark_mean(const SeriesWeights& weights) const;
  double dark_variance(const SeriesWeights& weights) const;

  /// Relative frame-to-frame scatter of the light, photon noise less: pooled over all flats; 0 where it is
  /// not resolved.
  double flicker() const { return flicker_; }
  double flicker_dof() const { return flicker_dof_; }
  /// Frame-to-frame scatter of the dark level [DN], likewise over all darks.
  double offset_jitter_dn() const { return jitter_; }
  double offset_jitter_dof() const { return jitter_dof_; }
  /// Standard uncertainty of a series' mean: temporal noise (of a single frame an upper bound), and the
  /// scatter of light or offset between frames as far as any series of several frames shows it.
  double mean_uncertainty(std::size_t series) const;

 private:
  void find_scatter();
  void find_range_top();
  double saturation_signal(std::size_t block, const std::vector<const Level*>& rising, double& noise) const;
  double block_share(std::size_t series, std::size_t block) const;
  double dark_share(const Level& level, std::size_t block) const;

  const AnalysisInput& input_;
  std::size_t region_;
  Codes codes_;
  std::vector<Level> levels_;
  RangeTop top_;
  double flicker_ = 0, flicker_dof_ = 0, jitter_ = 0, jitter_dof_ = 0;
};

/// " in region NAME" for messages; nothing where the whole frame is the region.
std::string in_region(const RegionLevels& levels);

}  // namespace evenfield
