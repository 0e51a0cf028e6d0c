#pragma once
/// Delete-one-block jackknife: the covariance of several statistics from their values with each block left
/// out.
///   C_ij = (B-1)/B sum_b (s_i(b) - mean s_i)(s_j(b) - mean s_j)
/// Degrees of freedom: B - 1. Right for gain, read noise and dark current; a fixed pattern is no sample, so
/// for offset, DSNU and PRNU it overstates. Source: METHODS 7.3.

#include "base/error.h"
#include "model/matrix.h"

namespace evenfield {

struct Jackknife {
  Matrix covariance;          ///< statistics x statistics
  std::vector<double> means;  ///< of the left-out values
  double degrees_of_freedom = 0;
};

/// `left_out` has a row per block that was left out and a column per statistic. Error `input` below 2 blocks
/// or for a value that is not finite.
Result<Jackknife> jackknife(const Matrix& left_out);

}  // namespace evenfield
