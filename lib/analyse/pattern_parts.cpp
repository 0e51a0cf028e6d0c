#include "analyse/pattern_parts.h"

#include <algorithm>
#include <cmath>

#include "model/spatial.h"
#include "model/spatial_parts.h"

namespace evenfield {
namespace {

struct LineParts {
  PatternPart row, column, pixel;
};

/// Of the mean frame of one series. Noise that rows share is averaged over frames, not over a row's pixels:
/// it is no pattern and goes out of the row part.
Result<LineParts> line_parts(const RegionSummary& s) {
  const double frames = s.frames;
  const double row_noise = std::max(0.0, s.row_noise_variance.value_or(0.0)) / frames;
  const double left = std::max(0.0, *s.variance / frames - row_noise);
  const LineVariances variances{*s.spatial_variance + *s.variance / frames, s.column_means_variance,
                                s.row_means_variance, static_cast<double>(s.rows),
                                static_cast<double>(s.columns)};
  const auto parts = spatial_parts(variances, left);
  if (!parts) return parts.error();
  const auto spread = spatial_part_variances(variances, left, frames);
  if (!spread) return spread.error();
  const auto part = [](double square, const PartVariance& v) {
    return PatternPart{square, std::sqrt(v.variance), v.degrees_of_freedom};
  };
  LineParts out{part(parts->row - row_noise, spread->row), part(parts->column, spread->column),
                part(parts->pixel, spread->pixel)};
  if (row_noise > 0 && s.rows > 1)
    out.row.square_uncertainty =
        std::hypot(out.row.square_uncertainty, row_noise * std::sqrt(2.0 / ((s.rows - 1) * (frames - 1))));
  return out;
}

PatternPart difference(const PatternPart& a, const PatternPart& b) {
  PatternPart out{a.square - b.square, std::hypot(a.square_uncertainty, b.square_uncertainty), {}};
  if (a.degrees_of_freedom && b.degrees_of_freedom)
    out.degrees_of_freedom = std::min(*a.degrees_of_freedom, *b.degrees_of_freedom);
  return out;
}

/// What the second look said of one series, or why it said nothing.
std::optional<PatternPart> high_pass_part(const RegionLevels& levels,
                                          std::size_t series,
                                          std::string& reason,
                                          std::optional<double>& filtered) {
  const auto& looks = levels.input().mean_frames;
  if (series >= looks.size() || levels.region() >= looks[series].size()) {
    reason = "the mean frame was not looked at";
    return std::nullopt;
  }
  const HighPassVariance& found = looks[series][levels.region()].high_pass;
  if (!found.variance_dn2) {
    reason = found.note;
    return std::nullopt;
  }
  filtered = found.filtered_dn2;
  const RegionSummary& s = levels.summary(series);
  double variance = spatial_variance_variance(
      *found.variance_dn2, *s.variance, {static_cast<double>(found.pixels), static_cast<double>(s.frames)});
  // As for the unfiltered pattern: noise of rows once more.
  if (s.row_noise_variance && *s.row_noise_variance > 0 && s.rows > 1)
    variance += spatial_variance_variance(s.row_pattern_variance - *s.row_noise_variance / s.frames,
                                          *s.row_noise_variance,
                                          {static_cast<double>(s.rows), static_cast<double>(s.frames)});
  return PatternPart{*found.variance_dn2, std::sqrt(variance), std::nullopt};
}

void put_lines(const Result<LineParts>& parts, PatternParts& out) {
  if (!parts) {
    out.reason = "needs two rows and two columns or more";
    return;
  }
  out.row = parts->row;
  out.column = parts->column;
  out.pixel = parts->pixel;
}

}  // namespace

Patterns find_pattern_parts(const RegionLevels& levels, const Nonuniformity& nonuniformity) {
  Patterns out;
  if (!nonuniformity.dark) {
    out.dark.reason = out.dark.high_pass_reason = nonuniformity.dark_reason;
  } else {
    const std::size_t series = nonuniformity.dark->series;
    put_lines(line_parts(levels.summary(series)), out.dark);
    std::optional<double> filtered;
    out.dark.high_pass = high_pass_part(levels, series, out.dark.high_pass_reason, filtered);
    if (filtered && *filtered > 0) out.dark.high_pass_filtered_dn = std::sqrt(*filtered);
  }
  if (!nonuniformity.light) {
    out.light.reason = out.light.high_pass_reason = nonuniformity.light_reason;
    return out;
  }
  const std::size_t flat = nonuniformity.light->series;
  const std::size_t dark = nonuniformity.light_dark_series;
  const auto of_flat = line_parts(levels.summary(flat));
  const auto of_dark = line_parts(levels.summary(dark));
  if (of_flat && of_dark)
    put_lines(LineParts{difference(of_flat->row, of_dark->row), difference(of_flat->column, of_dark->column),
                        difference(of_flat->pixel, of_dark->pixel)},
              out.light);
  else
    put_lines(of_flat ? of_dark : of_flat, out.light);
  std::optional<double> filtered_flat;
  std::optional<double> filtered_dark;
  const auto high_flat = high_pass_part(levels, flat, out.light.high_pass_reason, filtered_flat);
  const auto high_dark = high_pass_part(levels, nonuniformity.light_high_pass_dark_series,
                                        out.light.high_pass_reason, filtered_dark);
  if (!high_flat || !high_dark) return out;
  out.light.high_pass = difference(*high_flat, *high_dark);
  if (filtered_flat && filtered_dark && *filtered_flat > *filtered_dark)
    out.light.high_pass_filtered_dn = std::sqrt(*filtered_flat - *filtered_dark);
  return out;
}

}  // namespace evenfield
