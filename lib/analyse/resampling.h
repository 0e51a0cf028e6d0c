#pragma once
/// Sums of a summary over the units that the jackknife leaves out one by one: blocks, or bands of whole rows
/// of blocks where the pixels of a row share noise.

#include <array>
#include <vector>

#include "analyse/series_summary.h"

namespace evenfield {

enum class ResamplingUnit { blocks, bands };

int unit_count(const RegionSummary& summary, ResamplingUnit unit);

/// One series; `left_out` -1 leaves out nothing.
class UnitSums {
 public:
  UnitSums(const RegionSummary& summary, ResamplingUnit unit);
  double mean(int left_out) const;      ///< DN
  double variance(int left_out) const;  ///< temporal [DN^2], 0 for a single frame
  double dof(int left_out) const;
  /// Sum of the covariances of a pixel's noise with its eight neighbours [DN^2], from the difference of the
  /// first two frames. 0 for a single frame.
  double neighbour_covariance(int left_out) const;
  /// Pixels behind that.
  double neighbour_pixels(int left_out) const;

 private:
  struct Sums {
    double pixels = 0, sum = 0, squares = 0, dof = 0;
    double pair_pixels = 0, cells = 0;
    std::array<double, kNeighbours> pairs{}, products{};
  };
  Sums without(int left_out) const;
  std::vector<Sums> units_;
  Sums all_;
};

}  // namespace evenfield
