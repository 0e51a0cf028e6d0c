#pragma once
/// A measured number as people read it: the uncertainty to two significant digits, the value and the interval
/// to the same place, one common power of ten where the number is very small or very large.

#include <optional>
#include <string>

namespace evenfield {

struct MeasuredText {
  std::string value;        ///< "0.4604", or "" if absent
  std::string uncertainty;  ///< "0.0021", or ""
  std::string low, high;    ///< ends of the 95 % interval, or ""
  std::string power;        ///< "-5" if all four are to be multiplied by ten to that power, else ""
};

/// Without an uncertainty the value has five significant digits, and whole numbers all of theirs.
MeasuredText measured_text(const std::optional<double>& value,
                           const std::optional<double>& uncertainty,
                           const std::optional<double>& low,
                           const std::optional<double>& high);

}  // namespace evenfield
