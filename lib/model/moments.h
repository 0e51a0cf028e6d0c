#pragma once
/// Count, mean and spread of a stream of numbers, in the units of what is added. No difference of large sums:
/// data far from zero keep their digits. Merging fixed pieces in their order gives the same bits for any
/// number of threads.

#include <cstdint>
#include <optional>
#include <span>

namespace evenfield {

class Moments {
  std::uint64_t count_ = 0;
  double mean_ = 0;
  double squares_ = 0;  ///< sum of squared deviations from the mean

 public:
  void add(double x) {
    const double deviation = x - mean_;
    mean_ += deviation / static_cast<double>(++count_);
    squares_ += deviation * (x - mean_);
  }
  /// As if the samples of `other` had been added here.
  void merge(const Moments& other) {
    if (other.count_ == 0) return;
    const double mine = static_cast<double>(count_);
    const double theirs = static_cast<double>(other.count_);
    const double difference = other.mean_ - mean_;
    squares_ += other.squares_ + difference * difference * mine * theirs / (mine + theirs);
    mean_ += difference * theirs / (mine + theirs);
    count_ += other.count_;
  }
  std::uint64_t count() const { return count_; }
  /// Absent for an empty stream.
  std::optional<double> mean() const { return count_ > 0 ? std::optional(mean_) : std::nullopt; }
  /// Sum of squares over count - 1; absent below two samples.
  std::optional<double> variance() const {
    return count_ > 1 ? std::optional(squares_ / static_cast<double>(count_ - 1)) : std::nullopt;
  }
};

/// sum (y_i - m)(y_(i+1) - m) / sum (y_i - m)^2; absent below two samples or without spread.
std::optional<double> lag_one_correlation(std::span<const double> values);

}  // namespace evenfield
