#include "model/line_fit.h"

#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <limits>
#include <string>

#include "base/text.h"

namespace evenfield {
namespace {

Error unusable(std::string what) { return Error{Errc::input, {}, std::move(what)}; }

/// The first point that cannot take part, in words; empty if all can.
std::string defect_of(std::span<const LinePoint> points) {
  for (std::size_t i = 0; i < points.size(); ++i) {
    const LinePoint& point = points[i];
    const std::string place = "line fit, point " + std::to_string(i + 1) + ": ";
    if (!std::isfinite(point.x) || !std::isfinite(point.y)) {
      return place + "found (" + to_text(point.x) + ", " + to_text(point.y) + "), expected finite numbers";
    }
    if (!std::isfinite(point.weight) || point.weight <= 0) {
      return place + "found weight " + to_text(point.weight) + ", expected a finite weight above 0";
    }
  }
  return {};
}

}  // namespace

double Line::correlation() const {
  const double scale = std::sqrt(intercept_variance * slope_variance);
  return scale > 0 ? covariance / scale : 0.0;
}

Result<Line> fit_line(std::span<const LinePoint> points) {
  if (std::string defect = defect_of(points); !defect.empty()) return unusable(std::move(defect));
  double weights = 0, sum_x = 0, sum_y = 0;
  for (const LinePoint& point : points) {
    weights += point.weight;
    sum_x += point.weight * point.x;
    sum_y += point.weight * point.y;
  }
  if (points.size() < 2) {
    return unusable("line fit: found " + std::to_string(points.size()) + " points, expected at least 2");
  }
  const double mean_x = sum_x / weights;
  const double mean_y = sum_y / weights;
  double sxx = 0, sxy = 0;
  for (const LinePoint& point : points) {
    const double dx = point.x - mean_x;
    sxx += point.weight * dx * dx;
    sxy += point.weight * dx * (point.y - mean_y);
  }
  // Equal abscissae leave only the rounding of their mean.
  const double rounding = 8 * std::numeric_limits<double>::epsilon() * std::abs(mean_x);
  if (!(sxx > weights * rounding * rounding)) {
    return unusable("line fit: found one abscissa, " + to_text(mean_x) + ", expected at least 2 different");
  }
  Line line;
  line.slope = sxy / sxx;
  line.intercept = mean_y - line.slope * mean_x;
  line.slope_variance = 1 / sxx;
  line.intercept_variance = 1 / weights + mean_x * mean_x / sxx;
  line.covariance = -mean_x / sxx;
  for (const LinePoint& point : points) {
    const double residual = (point.y - mean_y) - line.slope * (point.x - mean_x);
    line.chi2 += point.weight * residual * residual;
  }
  line.points = static_cast<int>(points.size());
  line.degrees_of_freedom = line.points - 2;
  return line;
}

Result<Line> fit_line_through_origin(std::span<const LinePoint> points) {
  if (std::string defect = defect_of(points); !defect.empty()) return unusable(std::move(defect));
  double sxx = 0, sxy = 0;
  for (const LinePoint& point : points) {
    sxx += point.weight * point.x * point.x;
    sxy += point.weight * point.x * point.y;
  }
  if (!(sxx > 0)) return unusable("line through the origin: found no point away from 0, expected at least 1");
  Line line;
  line.slope = sxy / sxx;
  line.slope_variance = 1 / sxx;
  for (const LinePoint& point : points) {
    const double residual = point.y - line.slope * point.x;
    line.chi2 += point.weight * residual * residual;
  }
  line.points = static_cast<int>(points.size());
  line.degrees_of_freedom = line.points - 1;
  return line;
}

Result<Line> scaled_by_residuals(const Line& line) {
  if (line.degrees_of_freedom < 1) {
    return unusable("line fit: found no point beyond the " + std::to_string(line.points) +
                    " that fix the line, expected more to tell its uncertainty");
  }
  Line scaled = line;
  const double factor = line.chi2 / line.degrees_of_freedom;
  scaled.intercept_variance *= factor;
  scaled.slope_variance *= factor;
  scaled.covariance *= factor;
  return scaled;
}

double LinearModel::scaled_uncertainty(int coefficient) const {
  if (degrees_of_freedom < 1) return std::numeric_limits<double>::quiet_NaN();
  return std::sqrt(covariance(coefficient, coefficient) * chi2 / degrees_of_freedom);
}

Result<LinearModel> fit_linear_model(const Matrix& regressors,
                                     std::span<const double> y,
                                     std::span<const double> weights) {
  const int rows = regressors.rows;
  const int columns = regressors.columns;
  if (y.size() != static_cast<std::size_t>(rows) || (!weights.empty() && weights.size() != y.size())) {
    return unusable("linear fit: found " + std::to_string(y.size()) + " ordinates and " +
                    std::to_string(weights.size()) + " weights, expected one for each of the " +
                    std::to_string(rows) + " rows");
  }
  if (columns < 1 || rows < columns) {
    return unusable("linear fit: found " + std::to_string(rows) + " points, expected at least " +
                    std::to_string(std::max(columns, 1)));
  }
  Eigen::MatrixXd factors(rows, columns);
  Eigen::VectorXd right(rows);
  for (int row = 0; row < rows; ++row) {
    const auto at = static_cast<std::size_t>(row);
    const double weight = weights.empty() ? 1.0 : weights[at];
    bool usable = std::isfinite(weight) && weight > 0 && std::isfinite(y[at]);
    const double root = usable ? std::sqrt(weight) : 0;
    for (int column = 0; column < columns; ++column) {
      usable = usable && std::isfinite(regressors(row, column));
      factors(row, column) = root * regressors(row, column);
    }
    if (!usable) {
      return unusable("linear fit, point " + std::to_string(row + 1) +
                      ": found a value that is not finite or a weight not above 0, expected finite numbers");
    }
    right(row) = root * y[at];
  }
  // Columns of length 1: the units of the regressors no longer matter to pivoting and rank.
  Eigen::VectorXd lengths(columns);
  for (int column = 0; column < columns; ++column) {
    lengths(column) = factors.col(column).norm();
    if (!(lengths(column) > 0) || !std::isfinite(lengths(column))) {
      return unusable("linear fit: found regressor " + std::to_string(column + 1) +
                      " zero throughout or too large, expected values that differ from 0");
    }
    factors.col(column) /= lengths(column);
  }
  const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> decomposition(factors);
  if (decomposition.rank() < columns) {
    return unusable("linear fit: found regressors that depend on each other (rank " +
                    std::to_string(decomposition.rank()) + "), expected " + std::to_string(columns) +
                    " independent ones");
  }
  const Eigen::VectorXd solution = decomposition.solve(right);
  const Eigen::MatrixXd inverse = decomposition.matrixR()
                                      .topLeftCorner(columns, columns)
                                      .triangularView<Eigen::Upper>()
                                      .solve(Eigen::MatrixXd::Identity(columns, columns));
  const Eigen::MatrixXd spread = decomposition.colsPermutation() * (inverse * inverse.transpose()) *
                                 decomposition.colsPermutation().transpose();

  LinearModel model;
  model.covariance = Matrix(columns, columns);
  for (int row = 0; row < columns; ++row) {
    model.coefficients.push_back(solution(row) / lengths(row));
    for (int column = 0; column < columns; ++column) {
      model.covariance(row, column) = spread(row, column) / (lengths(row) * lengths(column));
    }
  }
  model.chi2 = (right - factors * solution).squaredNorm();
  model.points = rows;
  model.degrees_of_freedom = rows - columns;
  return model;
}

Result<LinearModel> fit_polynomial(std::span<const LinePoint> points, int degree) {
  if (degree < 0) {
    return unusable("polynomial fit: found degree " + std::to_string(degree) + ", expected 0 or more");
  }
  if (std::string defect = defect_of(points); !defect.empty()) return unusable(std::move(defect));
  double scale = 0;
  for (const LinePoint& point : points) scale = std::max(scale, std::abs(point.x));
  if (!(scale > 0)) scale = 1;

  Matrix powers(static_cast<int>(points.size()), degree + 1);
  std::vector<double> y, weights;
  for (int row = 0; row < powers.rows; ++row) {
    const LinePoint& point = points[static_cast<std::size_t>(row)];
    double power = 1;
    for (int column = 0; column <= degree; ++column, power *= point.x / scale) powers(row, column) = power;
    y.push_back(point.y);
    weights.push_back(point.weight);
  }
  Result<LinearModel> model = fit_linear_model(powers, y, weights);
  if (!model) return model;
  for (int row = 0; row <= degree; ++row) {
    model->coefficients[static_cast<std::size_t>(row)] /= std::pow(scale, row);
    for (int column = 0; column <= degree; ++column) {
      model->covariance(row, column) /= std::pow(scale, row + column);
    }
  }
  return model;
}

}  // namespace evenfield
