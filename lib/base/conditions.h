#pragma once
/// Under which conditions the frames of one series were taken. What was not recorded is absent.

#include <optional>

namespace evenfield {

enum class SeriesKind { flat, dark, bias };  ///< a bias is a dark of zero exposure

constexpr const char* name_of(SeriesKind kind) {
  switch (kind) {
    case SeriesKind::flat:
      return "flat";
    case SeriesKind::dark:
      return "dark";
    case SeriesKind::bias:
      return "bias";
  }
  return "";
}

struct Conditions {
  SeriesKind kind = SeriesKind::flat;
  std::optional<double> exposure_s;  ///< 0 for a bias
  double light = 1.0;                ///< relative light level; the axis of linearity is exposure_s x light
  std::optional<double> temperature_c;
  std::optional<double> em_gain;
  std::optional<double> control_v;
};

}  // namespace evenfield
