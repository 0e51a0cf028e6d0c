#include "model/gum.h"

#include <cmath>
#include <limits>
#include <string>

namespace evenfield {
namespace {

std::string size_of(const Matrix& matrix) {
  return std::to_string(matrix.rows) + " x " + std::to_string(matrix.columns);
}

}  // namespace

Result<Matrix> propagate(const Matrix& jacobian, const Matrix& covariance) {
  if (covariance.rows != covariance.columns || jacobian.columns != covariance.rows) {
    return Error{Errc::input,
                 {},
                 "propagation of uncertainty: found sensitivities of " + size_of(jacobian) +
                     " with a covariance of " + size_of(covariance) + ", expected as many columns as inputs"};
  }
  Matrix outputs(jacobian.rows, jacobian.rows);
  for (int row = 0; row < outputs.rows; ++row) {
    for (int column = 0; column <= row; ++column) {
      double sum = 0;
      for (int i = 0; i < covariance.rows; ++i) {
        for (int j = 0; j < covariance.columns; ++j) {
          sum += jacobian(row, i) * covariance(i, j) * jacobian(column, j);
        }
      }
      outputs(row, column) = sum;
      outputs(column, row) = sum;
    }
  }
  return outputs;
}

Result<Matrix> covariance_of_means(const Matrix& observations) {
  const int rows = observations.rows;
  const int columns = observations.columns;
  if (rows < 2) {
    return Error{Errc::input,
                 {},
                 "covariance of means: found " + std::to_string(rows) + " observations, expected at least 2"};
  }
  std::vector<double> means;
  for (int column = 0; column < columns; ++column) {
    double sum = 0;
    for (int row = 0; row < rows; ++row) sum += observations(row, column);
    means.push_back(sum / rows);
  }
  Matrix covariance(columns, columns);
  for (int i = 0; i < columns; ++i) {
    for (int j = 0; j <= i; ++j) {
      double sum = 0;
      for (int row = 0; row < rows; ++row) {
        sum += (observations(row, i) - means[static_cast<std::size_t>(i)]) *
               (observations(row, j) - means[static_cast<std::size_t>(j)]);
      }
      covariance(i, j) = sum / (static_cast<double>(rows) * (rows - 1));
      covariance(j, i) = covariance(i, j);
    }
  }
  return covariance;
}

Matrix correlation_of(const Matrix& covariance) {
  Matrix correlation(covariance.rows, covariance.columns);
  for (int row = 0; row < covariance.rows; ++row) {
    for (int column = 0; column < covariance.columns; ++column) {
      const double scale = std::sqrt(covariance(row, row)) * std::sqrt(covariance(column, column));
      correlation(row, column) = row == column ? 1.0 : scale > 0 ? covariance(row, column) / scale : 0.0;
    }
  }
  return correlation;
}

double combined_uncertainty(std::span<const Contribution> contributions) {
  double sum = 0;
  for (const Contribution& part : contributions) sum += part.standard_uncertainty * part.standard_uncertainty;
  return std::sqrt(sum);
}

double effective_degrees_of_freedom(std::span<const Contribution> contributions) {
  // Shares of the whole instead of fourth powers, which would underflow for small units.
  const double combined = combined_uncertainty(contributions);
  double sum = 0;
  for (const Contribution& part : contributions) {
    if (!(part.standard_uncertainty > 0)) continue;
    const double share = part.standard_uncertainty / combined;
    sum += share * share * share * share / part.degrees_of_freedom;
  }
  return sum > 0 ? 1 / sum : std::numeric_limits<double>::infinity();
}

}  // namespace evenfield
