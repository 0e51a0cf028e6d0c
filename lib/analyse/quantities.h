#pragma once
/// From an estimate to a quantity of the result: interval and wording.

#include <string>

#include "result/characterization.h"

namespace evenfield {

struct Estimate {
  double value = 0;
  double statistical_uncertainty = 0;
  double common_uncertainty = 0;
  std::optional<double> degrees_of_freedom;  ///< of the statistical part; absent: many
};

/// value +- k u with k of Student's t; the effective degrees of freedom grow with the common part, whose own
/// are many.
Quantity known(std::string name,
               const std::string& region,
               const Estimate& estimate,
               std::string method,
               std::string note = {});

/// A quantity that could not be had.
Quantity unknown(std::string name, const std::string& region, std::string reason);

/// A square root of a difference of variances (DSNU, PRNU): the interval is that of the square, so that it is
/// asymmetric near zero; a negative square gives no value but a `high95`. `square_uncertainty` is the
/// standard uncertainty of `square`; `divisor` and its relative uncertainty turn DN into the quantity's unit.
Quantity root_of_square(std::string name,
                        const std::string& region,
                        double square,
                        double square_uncertainty,
                        double divisor,
                        double divisor_relative_uncertainty,
                        std::string method,
                        std::string note = {});

}  // namespace evenfield
