#pragma once
/// A small dense matrix as plain data, rows first: what fits and propagation hand to each other. Linear
/// algebra itself stays inside the .cpp files, because its headers cost seconds to compile.

#include <cstddef>
#include <vector>

namespace evenfield {

struct Matrix {
  int rows = 0;
  int columns = 0;
  std::vector<double> values;  ///< rows x columns, rows first

  Matrix() = default;
  Matrix(int row_count, int column_count)
      : rows(row_count),
        columns(column_count),
        values(static_cast<std::size_t>(row_count) * static_cast<std::size_t>(column_count), 0.0) {}

  double& operator()(int row, int column) { return values[index(row, column)]; }
  double operator()(int row, int column) const { return values[index(row, column)]; }

 private:
  std::size_t index(int row, int column) const {
    return static_cast<std::size_t>(row) * static_cast<std::size_t>(columns) +
           static_cast<std::size_t>(column);
  }
};

}  // namespace evenfield
