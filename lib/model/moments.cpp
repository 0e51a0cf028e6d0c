#include "model/moments.h"

namespace evenfield {

std::optional<double> lag_one_correlation(std::span<const double> values) {
  Moments moments;
  for (const double value : values) moments.add(value);
  if (moments.count() < 2) return std::nullopt;
  const double mean = *moments.mean();
  double products = 0, squares = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    const double deviation = values[i] - mean;
    squares += deviation * deviation;
    if (i + 1 < values.size()) products += deviation * (values[i + 1] - mean);
  }
  if (!(squares > 0)) return std::nullopt;
  return products / squares;
}

}  // namespace evenfield
