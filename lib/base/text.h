#pragma once
/// Numbers and names as text, the same on every machine: no locale, shortest form that reads back
/// bit-exactly.

#include <string>
#include <string_view>
#include <vector>

namespace evenfield {

/// Shortest decimal that reads back to the same double; "nan", "inf", "-inf" otherwise.
std::string to_text(double value);

/// `value` to `digits` significant digits, for people ("0.4604", "2.18e-05").
std::string to_text(double value, int digits);

/// Control characters (C0, DEL, C1 in UTF-8) and bytes that are not UTF-8 as \xNN, so that nothing read from
/// a file can steer a terminal, a log or a page.
std::string escape_control(std::string_view text);

/// Up to three entries of `known` that are near `name` (edit distance at most 2, or a third of its length),
/// for "did you mean".
std::vector<std::string> near_names(std::string_view name, const std::vector<std::string>& known);

}  // namespace evenfield
