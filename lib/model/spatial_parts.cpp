#include "model/spatial_parts.h"

#include "base/text.h"

namespace evenfield {
namespace {

Status check(const LineVariances& variances) {
  if (variances.rows >= 2 && variances.columns >= 2) return Done{};
  return Error{Errc::input,
               {},
               "parts of the pattern: found an image of " + to_text(variances.columns) + " x " +
                   to_text(variances.rows) + " pixels, expected 2 x 2 or more"};
}

/// Mean squares of the two-way layout, from population variances; what is left after rows and columns has
/// (M-1)(N-1) degrees of freedom.
struct MeanSquares {
  double rows = 0;
  double columns = 0;
  double rest = 0;
};

MeanSquares mean_squares(const LineVariances& v) {
  const double m = v.rows, n = v.columns;
  return {n * v.of_rows * m / (m - 1), m * v.of_columns * n / (n - 1),
          (v.all - v.of_columns - v.of_rows) * m * n / ((m - 1) * (n - 1))};
}

double normal_variance(double mean_square, double degrees_of_freedom) {
  return 2 * mean_square * mean_square / degrees_of_freedom;
}

}  // namespace

Result<SpatialParts> spatial_parts(const LineVariances& variances, double temporal_left) {
  if (const Status good = check(variances); !good) return good.error();
  const MeanSquares squares = mean_squares(variances);
  return SpatialParts{(squares.rows - squares.rest) / variances.columns,
                      (squares.columns - squares.rest) / variances.rows, squares.rest - temporal_left};
}

Result<SpatialParts> spatial_parts_by_system(const LineVariances& variances, double temporal_left) {
  if (const Status good = check(variances); !good) return good.error();
  const double m = variances.rows, n = variances.columns;
  const double determinant = m * n - m - n;
  if (!(determinant > 0))
    return Error{
        Errc::input, {}, "parts of the pattern: found an image of 2 x 2 pixels, expected 2 x 3 or more"};
  const double s = variances.all, c = variances.of_columns, r = variances.of_rows;
  return SpatialParts{((m * n - n) * r - m * (s - c)) / determinant,
                      ((m * n - m) * c - n * (s - r)) / determinant,
                      m * n / determinant * (s - c - r) - temporal_left};
}

Result<SpatialPartVariances> spatial_part_variances(const LineVariances& variances,
                                                    double temporal_left,
                                                    double frames) {
  if (const Status good = check(variances); !good) return good.error();
  const MeanSquares squares = mean_squares(variances);
  const double m = variances.rows, n = variances.columns;
  const double free_rows = m - 1, free_columns = n - 1, free_rest = free_rows * free_columns;
  const double rest = normal_variance(squares.rest, free_rest);
  const double correction = frames >= 2 ? normal_variance(temporal_left, m * n * (frames - 1)) : 0.0;
  SpatialPartVariances out;
  out.row = {(normal_variance(squares.rows, free_rows) + rest) / (n * n), free_rows};
  out.column = {(normal_variance(squares.columns, free_columns) + rest) / (m * m), free_columns};
  out.pixel = {rest + correction, free_rest};
  return out;
}

}  // namespace evenfield
