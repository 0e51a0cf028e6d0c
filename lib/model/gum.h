#pragma once
/// Propagation of uncertainty after JCGM 100:2008: full covariances, and effective degrees of freedom.

#include <functional>
#include <span>
#include <vector>

#include "base/error.h"
#include "model/matrix.h"

namespace evenfield {

/// J C J^T: covariance of the outputs, `jacobian` outputs x inputs, `covariance` inputs x inputs.
/// Error `input` if the sizes do not fit.
Result<Matrix> propagate(const Matrix& jacobian, const Matrix& covariance);

/// Covariance of the means of columns that were observed together, n rows: sum of products / (n (n-1)).
/// Error `input` below 2 rows.
Result<Matrix> covariance_of_means(const Matrix& observations);

/// Correlation coefficients of a covariance matrix; 0 with an input of no variance, 1 on the diagonal.
Matrix correlation_of(const Matrix& covariance);

/// One contribution to a combined uncertainty; infinite degrees of freedom for one known exactly.
struct Contribution {
  double standard_uncertainty = 0;
  double degrees_of_freedom = 0;
};

/// Root sum of squares of independent contributions.
double combined_uncertainty(std::span<const Contribution> contributions);

/// Welch-Satterthwaite: u^4 / sum(u_i^4 / nu_i); infinity if all of them are known exactly.
double effective_degrees_of_freedom(std::span<const Contribution> contributions);

}  // namespace evenfield
