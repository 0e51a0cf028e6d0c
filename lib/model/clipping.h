#pragma once
/// Normal noise against a hard upper code. Source: METHODS 3.1 and 7.1, normal tail, derived there.

#include "base/error.h"

namespace evenfield {

/// Mean [DN] of a pixel of variance b + K mean (K in DN/e-) at which the share `fraction`
/// of samples reaches `top_code` (code - 1/2 or above); both less the offset. Error `input` if fraction is
/// outside (0, 0.5) or no such mean exists.
Result<double> mean_at_clipped_fraction(double top_code, double gain, double dark_variance, double fraction);

/// Standard uncertainty of that mean [DN] from counting `pixels` samples.
double clipped_mean_uncertainty(double fraction, double pixels, double sigma_dn);

/// Variance of a normal variable over the true one after everything beyond +-z standard deviations was
/// removed.
double clipped_variance_factor(double z);

}  // namespace evenfield
