#include "analyse/resampling.h"

namespace evenfield {

int unit_count(const RegionSummary& summary, ResamplingUnit unit) {
  return unit == ResamplingUnit::bands ? summary.block_rows : summary.block_rows * summary.block_columns;
}

UnitSums::UnitSums(const RegionSummary& summary, ResamplingUnit unit)
    : units_(static_cast<std::size_t>(unit_count(summary, unit))) {
  const auto columns = static_cast<std::size_t>(summary.block_columns);
  for (std::size_t b = 0; b < summary.block_mean.size(); ++b) {
    Sums& sums = units_[unit == ResamplingUnit::bands ? b / columns : b];
    for (Sums* each : {&sums, &all_}) {
      each->pixels += summary.block_pixels[b];
      each->sum += summary.block_mean[b] * summary.block_pixels[b];
      each->squares += summary.block_squares[b];
      each->dof += summary.block_dof[b];
    }
  }
}

UnitSums::Sums UnitSums::without(int left_out) const {
  if (left_out < 0) return all_;
  const Sums& out = units_[static_cast<std::size_t>(left_out)];
  return {all_.pixels - out.pixels, all_.sum - out.sum, all_.squares - out.squares, all_.dof - out.dof};
}

double UnitSums::mean(int left_out) const {
  const Sums sums = without(left_out);
  return sums.sum / sums.pixels;
}

double UnitSums::variance(int left_out) const {
  const Sums sums = without(left_out);
  return sums.dof > 0 ? sums.squares / sums.dof : 0.0;
}

double UnitSums::dof(int left_out) const { return without(left_out).dof; }

}  // namespace evenfield
