#include "model/jackknife.h"

#include <cmath>
#include <string>

#include "base/text.h"

namespace evenfield {

Result<Jackknife> jackknife(const Matrix& left_out) {
  const int blocks = left_out.rows;
  const int statistics = left_out.columns;
  if (blocks < 2) {
    return Error{
        Errc::input, {}, "jackknife: found " + std::to_string(blocks) + " blocks, expected at least 2"};
  }
  Jackknife result;
  result.degrees_of_freedom = blocks - 1;
  for (int column = 0; column < statistics; ++column) {
    double sum = 0;
    for (int block = 0; block < blocks; ++block) {
      if (!std::isfinite(left_out(block, column))) {
        return Error{Errc::input,
                     {},
                     "jackknife, statistic " + std::to_string(column + 1) + " without block " +
                         std::to_string(block + 1) + ": found " + to_text(left_out(block, column)) +
                         ", expected a finite number"};
      }
      // Left-out values are nearly equal: their differences from the first keep the digits.
      sum += left_out(block, column) - left_out(0, column);
    }
    result.means.push_back(left_out(0, column) + sum / blocks);
  }
  result.covariance = Matrix(statistics, statistics);
  for (int row = 0; row < statistics; ++row) {
    for (int column = 0; column <= row; ++column) {
      double sum = 0;
      for (int block = 0; block < blocks; ++block) {
        sum += (left_out(block, row) - result.means[static_cast<std::size_t>(row)]) *
               (left_out(block, column) - result.means[static_cast<std::size_t>(column)]);
      }
      result.covariance(row, column) = sum * (blocks - 1) / blocks;
      result.covariance(column, row) = result.covariance(row, column);
    }
  }
  return result;
}

}  // namespace evenfield
