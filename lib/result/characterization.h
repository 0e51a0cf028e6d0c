#pragma once
/// What a session of frames says about a camera: the value that `analyse` makes and that report, judge, track
/// and compare read. Plain data; field names are those of result.json. What could not be determined is
/// absent, and `note` says why.

#include <cstdint>
#include <optional>
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "base/conditions.h"
#include "base/image.h"

namespace evenfield {

/// One number with its doubt. Unit and symbol stand in the table of quantities, under `name`.
struct Quantity {
  std::string name;
  std::string region;
  std::vector<std::pair<std::string, double>> condition;  ///< e.g. {"exposure_s", 0.01}
  std::optional<double> value;
  std::optional<double> standard_uncertainty;     ///< statistical and common part combined, k = 1
  std::optional<double> statistical_uncertainty;  ///< what changes from session to session
  std::optional<double> common_uncertainty;       ///< what repeats in every session, 0 where there is none
  std::optional<double> degrees_of_freedom;       ///< absent: so many that the normal distribution holds
  std::optional<double> low95, high95;            ///< 95 % interval; one of them alone is a one-sided bound
  std::string method;
  std::string note;
};

/// Correlation coefficients between quantities that share inputs; `names` are quantity names, followed by
/// "@region" if the session has several regions.
struct Correlations {
  std::vector<std::string> names;
  std::vector<std::vector<double>> matrix;
};

/// One series of frames in one region. DN include the camera's offset unless a name says signal.
struct SeriesResult {
  Conditions conditions;
  std::string region;
  int frames = 0;
  std::int64_t pixels = 0;
  double mean_dn = 0;
  double mean_uncertainty_dn = 0;
  std::optional<double>
      variance_dn2;  ///< temporal, after scale drift and hits, quantization included; 2 frames on
  std::optional<double> variance_uncertainty_dn2;
  double saturated_fraction = 0;
  std::optional<double> flicker_percent;
  std::int64_t hits = 0;
  std::vector<std::string> used_in;  ///< of gain, response, linearity
  std::vector<std::string> files;    ///< relative to the session file
};

enum class Severity { info, caution, problem };

constexpr const char* name_of(Severity severity) {
  switch (severity) {
    case Severity::info:
      return "info";
    case Severity::caution:
      return "caution";
    case Severity::problem:
      return "problem";
  }
  return "";
}

struct Finding {
  std::string code;  ///< of the table of findings
  Severity severity = Severity::info;
  std::string message;      ///< what was seen, what it does to which quantity, what to do about it
  std::vector<int> series;  ///< indices into Characterization::series
  std::vector<std::string> quantities;
  std::vector<std::pair<std::string, double>> evidence;  ///< the numbers seen, unit in the name
};

struct FrameRecord {
  std::string file;  ///< relative to the session file
  int page = 1;      ///< from 1
  SeriesKind kind = SeriesKind::flat;
  std::string fingerprint;  ///< 32 hexadecimal digits over the decoded pixels
};

struct Region {
  std::string name;
  Rect rect;
};

/// What the session file said, in its own keys and order, for the record.
using Setting = std::pair<std::string, std::variant<std::string, double, std::int64_t, bool>>;
struct SessionEcho {
  std::string file;
  std::vector<Setting> camera, light, analysis;
};

/// A point of a curve with its standard uncertainty, and what the fitted model says there.
struct CurvePoint {
  double x = 0;
  double y = 0;
  double y_uncertainty = 0;
  std::optional<double> fitted;
  bool used = false;  ///< took part in the fit
};

/// One frame's mean in one region, in the order of the session file.
struct FrameMean {
  int series = 0;  ///< index into Characterization::series
  SeriesKind kind = SeriesKind::flat;
  double relative = 1;      ///< flats: scale against the series' mean signal
  double deviation_dn = 0;  ///< frame mean less the series' mean
  double deviation_uncertainty =
      0;  ///< from temporal noise alone; unit of `relative` for flats, DN for darks
};

/// Lines of a frame, one value a column (or a row) of the region [DN].
struct Profiles {
  std::vector<double> middle;  ///< the middle row (or column)
  std::vector<double> mean, lowest, highest;
};

/// Power spectrum of the lines of a frame, mean over the lines, temporal noise taken out (EMVA 1288, from
/// memory): amplitude sqrt(p) [DN] at v / length cycles a pixel, v = 0 .. length / 2.
struct Spectrogram {
  int length = 0;  ///< pixels of a line
  int lines = 0;
  std::vector<double> amplitude_dn;
  double white_dn = 0;       ///< sqrt of the median of p: what has no structure
  double non_whiteness = 0;  ///< spatial variance over the white part's
  double temporal_dn = 0;    ///< sqrt of what temporal noise left and was taken out
};

/// How often values of the mean frame occur: bins of equal width from `first` (the centre of the first) on.
struct Histogram {
  double first = 0;
  double width = 0;
  std::vector<std::int64_t> counts;
};

/// What only the mean frame of a series shows: of the darks that DSNU is taken from, or of the flat near half
/// range.
struct MeanFrame {
  int series = 0;  ///< index into Characterization::series
  int frames = 0;
  double mean_dn = 0;
  Profiles along_row, along_column;  ///< one value a column, one value a row
  Spectrogram of_rows, of_columns;
  Histogram values;      ///< DN
  double normal_dn = 0;  ///< standard deviation of the white part, for a normal curve
  Histogram deviations;  ///< |value - mean| [DN], each count: that much or more
};

/// Signal-to-noise ratio of a pixel at one level, and what describes it at any.
struct SnrPoint {
  double signal_e = 0;
  double ratio = 0;  ///< signal over temporal noise
  double ratio_uncertainty = 0;
};
struct SnrCurve {
  std::vector<SnrPoint> points;
  double dark_noise_e = 0;             ///< quantization included
  std::optional<double> dsnu_e, prnu;  ///< PRNU as a fraction
  std::optional<double> saturation_e;
};

/// The curves behind the numbers, for pictures; not part of result.json.
struct RegionCurves {
  std::string region;
  std::vector<CurvePoint> photon_transfer;  ///< x signal [DN], y temporal variance less the dark's [DN^2]
  std::vector<CurvePoint> response;         ///< x exposure_s x light [s], y signal [DN]
  std::optional<double> range_top_dn;       ///< signal at the top of the usable range [DN]
  std::optional<double> gain_range_dn;      ///< signal up to which the gain was fitted [DN]
  bool saturates = false;
  std::vector<CurvePoint> dark_mean;  ///< x exposure [s], y mean of the dark [DN]
  std::vector<FrameMean> frame_means;
  /// What the curved model says at the points of photon_transfer, in their order; empty where it was not
  /// fitted.
  std::vector<double> photon_transfer_curved;
  std::optional<SnrCurve> snr;
  std::optional<MeanFrame> dark_frame, flat_frame;
};

struct Characterization {
  std::string program_name = "evenfield";
  std::string program_version;
  std::string created;                  ///< RFC 3339
  std::optional<std::string> acquired;  ///< RFC 3339
  SessionEcho session;
  std::vector<Region> regions;
  std::vector<Quantity> quantities;
  Correlations correlations;
  std::vector<SeriesResult> series;
  std::vector<Finding> findings;
  std::vector<FrameRecord> frames;
  std::vector<RegionCurves> curves;
};

}  // namespace evenfield
