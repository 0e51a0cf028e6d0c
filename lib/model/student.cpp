#include "model/student.h"

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>

namespace evenfield {
namespace {

namespace policies = boost::math::policies;
/// NaN or infinity instead of an exception: nothing is thrown across a stage.
using Quiet = policies::policy<policies::domain_error<policies::ignore_error>,
                               policies::pole_error<policies::ignore_error>,
                               policies::overflow_error<policies::ignore_error>,
                               policies::evaluation_error<policies::ignore_error>>;
using Normal = boost::math::normal_distribution<double, Quiet>;
using Student = boost::math::students_t_distribution<double, Quiet>;
using ChiSquare = boost::math::chi_squared_distribution<double, Quiet>;

bool is_normal(std::optional<double> degrees_of_freedom) {
  return !degrees_of_freedom || std::isinf(*degrees_of_freedom);
}

}  // namespace

double normal_cumulative(double z) { return boost::math::cdf(Normal(), z); }

double normal_quantile(double probability) { return boost::math::quantile(Normal(), probability); }

double student_quantile(double probability, std::optional<double> degrees_of_freedom) {
  if (is_normal(degrees_of_freedom)) return normal_quantile(probability);
  return boost::math::quantile(Student(*degrees_of_freedom), probability);
}

double student_cumulative(double t, std::optional<double> degrees_of_freedom) {
  if (is_normal(degrees_of_freedom)) return normal_cumulative(t);
  return boost::math::cdf(Student(*degrees_of_freedom), t);
}

double coverage_factor(double probability, std::optional<double> degrees_of_freedom) {
  return student_quantile((1 + probability) / 2, degrees_of_freedom);
}

double chi_square_quantile(double probability, double degrees_of_freedom) {
  return boost::math::quantile(ChiSquare(degrees_of_freedom), probability);
}

double chi_square_excess(double chi2, double degrees_of_freedom) {
  return boost::math::cdf(boost::math::complement(ChiSquare(degrees_of_freedom), chi2));
}

std::pair<double, double> deviation_interval_factors(double probability, double degrees_of_freedom) {
  const double tail = (1 - probability) / 2;
  return {std::sqrt(degrees_of_freedom / chi_square_quantile(1 - tail, degrees_of_freedom)),
          std::sqrt(degrees_of_freedom / chi_square_quantile(tail, degrees_of_freedom))};
}

}  // namespace evenfield
