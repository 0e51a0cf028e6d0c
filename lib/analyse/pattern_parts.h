#pragma once
/// Parts of DSNU and PRNU: rows, columns and pixels as random effects (model/spatial_parts.h), and what is
/// left without slow changes across the frame (the second look). PRNU's are the flat's less its dark's.

#include <optional>
#include <string>

#include "analyse/nonuniformity.h"

namespace evenfield {

/// A squared part with its standard uncertainty [DN^2].
struct PatternPart {
  double square = 0;
  double square_uncertainty = 0;
  std::optional<double> degrees_of_freedom;  ///< absent: many
};

struct PatternParts {
  std::optional<PatternPart> row, column, pixel;
  std::string reason;  ///< why there are none
  std::optional<PatternPart> high_pass;
  std::optional<double>
      high_pass_filtered_dn;  ///< root of the filtered variance, not divided by the filter's gain
  std::string high_pass_reason;
};

struct Patterns {
  PatternParts dark, light;
};

Patterns find_pattern_parts(const RegionLevels& levels, const Nonuniformity& nonuniformity);

}  // namespace evenfield
