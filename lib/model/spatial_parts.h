#pragma once
/// Rows, columns and pixels as parts of the fixed pattern of an averaged image. Variances in DN^2 (or any
/// unit squared). Source: METHODS 5.2. Temporal noise is what averaging L frames left in each pixel,
/// sigma^2/L. Parts below 0 are not resolved and stay as they are.

#include "base/error.h"

namespace evenfield {

/// Of an image of `rows` x `columns` pixels; variances of the population, with 1/n.
struct LineVariances {
  double all = 0;         ///< S, of all pixels
  double of_columns = 0;  ///< C, of the means of the columns
  double of_rows = 0;     ///< R, of the means of the rows
  double rows = 0;        ///< M
  double columns = 0;     ///< N
};

struct SpatialParts {
  double row = 0;
  double column = 0;
  double pixel = 0;
};

/// Without bias for any size: rows, columns and pixels as random effects, from mean squares. For results.
/// Error `input` below 2 rows or 2 columns.
Result<SpatialParts> spatial_parts(const LineVariances& variances, double temporal_left);

/// The linear system of EMVA 1288 R4.0 (from memory): S, C and R as sums of the parts. They add up to
/// S - sigma^2/L, but share out what lines have by chance; on images of megapixels the two forms agree to
/// 1e-3 of the parts or better. For comparison with other implementations of the standard. Error `input`
/// below 2 rows or 2 columns, and at 2 x 2, where the system has no solution.
Result<SpatialParts> spatial_parts_by_system(const LineVariances& variances, double temporal_left);

/// A variance with how well it is known.
struct PartVariance {
  double variance = 0;            ///< of the part [DN^4]
  double degrees_of_freedom = 0;  ///< of the mean square that dominates it
};

struct SpatialPartVariances {
  PartVariance row, column, pixel;
};

/// Sampling variances of spatial_parts(), normal patterns and noise, the image a sample of many:
///   row     2 (s_row^2 + (s_pix^2 + sigma^2/L)/N)^2/(M-1) + 2 (s_pix^2 + sigma^2/L)^2/(N^2 (M-1)(N-1))
///   column  likewise
///   pixel   2 (s_pix^2 + sigma^2/L)^2/((M-1)(N-1)) + 2 (sigma^2/L)^2/(M N (L-1))
/// The lines alone decide: 2000 rows give their part to 1.6 % of its root, however many columns there are.
/// The last term, of the temporal variance that was subtracted, needs `frames` >= 2 and is left out below.
/// Error `input` as for spatial_parts().
Result<SpatialPartVariances> spatial_part_variances(const LineVariances& variances,
                                                    double temporal_left,
                                                    double frames);

}  // namespace evenfield
