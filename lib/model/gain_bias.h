#pragma once
/// What disturbs the gain, in numbers: for findings, which must say what they do to which quantity, and for
/// planning. Source: METHODS 1.2, 1.3 and 13, derived there.

#include <span>

namespace evenfield {

/// Relative excess of the variance at a shot-limited signal when frames differ by a relative rms d that is
/// not taken out: d^2 Ne.
double flicker_variance_excess(double relative_rms, double signal_e);

/// V / x over K when the response is y = K Ne (1 - c) with c = beta Ne: (1 - 2c)^2 / (1 - c), about 1 - 3c.
double compressed_gain_ratio(double compression);

/// Standard error of the unweighted line through the origin over that of the best weights, for shot-limited
/// levels x: sqrt(L sum x^4) / sum x^2.
double origin_line_inefficiency(std::span<const double> levels);

}  // namespace evenfield
