#include "report/measured_text.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <initializer_list>

namespace evenfield {
namespace {

constexpr int kDigitsWithoutUncertainty = 5;
constexpr int kMostDigits = 12;

/// Decimal exponent of the first digit after rounding to `digits`, so that 9.96 to two digits counts as 10.
int exponent_of(double value, int digits) {
  std::array<char, 64> buffer{};
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), std::abs(value),
                                 std::chars_format::scientific, digits - 1)
                       .ptr;
  const std::string text(buffer.data(), end);
  return std::stoi(text.substr(text.find('e') + 1));
}

std::string fixed(double value, int decimals) {
  std::array<char, 400> buffer{};  // the largest double has 309 digits before the point
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                 std::chars_format::fixed, std::clamp(decimals, 0, 30))
                       .ptr;
  std::string text(buffer.data(), end);
  const bool zero = text.find_first_of("123456789") == std::string::npos;
  if (zero && text.front() == '-') text.erase(0, 1);
  return text;
}

}  // namespace

MeasuredText measured_text(const std::optional<double>& value,
                           const std::optional<double>& uncertainty,
                           const std::optional<double>& low,
                           const std::optional<double>& high) {
  const auto usable = [](const std::optional<double>& x) { return x && std::isfinite(*x); };
  double largest = 0;
  for (const auto* x : {&value, &low, &high})
    if (usable(*x)) largest = std::max(largest, std::abs(**x));
  const bool doubtful = usable(uncertainty) && *uncertainty > 0;
  if (doubtful) largest = std::max(largest, *uncertainty);
  const int top = largest > 0 ? exponent_of(largest, kDigitsWithoutUncertainty) : 0;
  int last = doubtful ? exponent_of(*uncertainty, 2) - 1 : top - kDigitsWithoutUncertainty + 1;
  last = std::max(last, top - kMostDigits);
  const bool whole = !doubtful && usable(value) && std::floor(*value) == *value && std::abs(*value) < 1e15;
  if (whole) last = 0;

  // A power of ten where plain digits would be mostly zeros.
  const bool scaled = !whole && largest > 0 && (top < -3 || top > 6);
  const int power = scaled ? top : 0;
  const auto text_of = [&](const std::optional<double>& x) {
    if (!usable(x)) return std::string();
    if (scaled) return fixed(*x / std::pow(10.0, power), power - last);
    const double step = std::pow(10.0, std::max(last, 0));  // "61230 +- 310" rather than 61234 +- 310
    return fixed(last > 0 ? std::round(*x / step) * step : *x, -last);
  };
  return {text_of(value), usable(uncertainty) ? text_of(uncertainty) : "", text_of(low), text_of(high),
          scaled && power != 0 ? std::to_string(power) : ""};
}

}  // namespace evenfield
