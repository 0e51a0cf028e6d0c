#include "accumulate/mean_frame.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <cstdint>
#include <limits>
#include <numeric>
#include <string>
#include <type_traits>

#include "accumulate/accumulate.h"
#include "base/parallel.h"
#include "base/text.h"

namespace evenfield {
namespace {

/// What holds the sum of kMostFrames pixels exactly, if they are integers.
template <class T>
using SumOf = std::conditional_t<std::is_floating_point_v<T>,
                                 double,
                                 std::conditional_t<(sizeof(T) > 2), std::int64_t, std::int32_t>>;
static_assert(std::int64_t{kMostFrames} * 65535 < std::int64_t{1} << 31);

/// Rows that are read together.
struct RowRange {
  int y = 0;
  int rows = 0;
};

/// So many pixels of a band keep their sums in cache; squares take five times the room.
constexpr int kBandPixels = 32768;
constexpr int kBandPixelsWithSquares = 8192;

/// Bands between multiples of a fixed number of rows, cut to the rows that regions touch.
std::vector<RowRange> make_bands(const FrameShape& shape,
                                 const std::vector<Rect>& regions,
                                 int rows_apart,
                                 int band_pixels) {
  int step = std::clamp(band_pixels / shape.width, 1, shape.height);
  // Pieces of rows are decoded once if no band ends inside of one.
  if (rows_apart > 0) step = (step + rows_apart - 1) / rows_apart * rows_apart;
  std::vector<RowRange> bands;
  for (int y = 0; y < shape.height; y += step) {
    int begin = shape.height;
    int end = 0;
    for (const Rect& rect : regions) {
      const int first = std::max(y, rect.y);
      const int last = std::min({y + step, rect.y + rect.height, shape.height});
      if (first >= last) continue;
      begin = std::min(begin, first);
      end = std::max(end, last);
    }
    if (begin < end) bands.push_back({begin, end - begin});
  }
  return bands;
}

template <class T>
void add_row(const T* pixels, int width, bool first, double level, SumOf<T>* sums) {
  if constexpr (std::is_floating_point_v<T>) {
    if (first) std::fill_n(sums, width, 0.0);
    for (int x = 0; x < width; ++x) sums[x] += static_cast<double>(pixels[x]) - level;
  } else if (first) {
    for (int x = 0; x < width; ++x) sums[x] = pixels[x];
  } else {
    for (int x = 0; x < width; ++x) sums[x] += pixels[x];
  }
}

/// The two highest samples of each pixel and the lowest.
template <class T>
struct Extremes {
  std::vector<T> highest, second, lowest;
};

template <class T>
void add_extremes(const T* pixels, int width, bool first, std::size_t at, Extremes<T>& to) {
  T* const highest = to.highest.data() + at;
  T* const second = to.second.data() + at;
  T* const lowest = to.lowest.data() + at;
  if (first) {
    for (int x = 0; x < width; ++x) highest[x] = lowest[x] = pixels[x];
    std::fill_n(second, width, std::numeric_limits<T>::lowest());
    return;
  }
  for (int x = 0; x < width; ++x) {
    const T v = pixels[x];
    const T lesser = v < highest[x] ? v : highest[x];
    second[x] = lesser > second[x] ? lesser : second[x];
    highest[x] = v > highest[x] ? v : highest[x];
    lowest[x] = v < lowest[x] ? v : lowest[x];
  }
}

/// Sums of deviations from the pixel's value in the first frame, which lies among the others: the difference
/// of the sums loses no digits that matter.
struct SquareSums {
  std::vector<double> origin, sums, squares;
};

template <class T>
void add_squares(const T* pixels, int width, bool first, double change, std::size_t at, SquareSums& to) {
  double* const origin = to.origin.data() + at;
  double* const sums = to.sums.data() + at;
  double* const squares = to.squares.data() + at;
  if (first) {
    for (int x = 0; x < width; ++x) origin[x] = static_cast<double>(pixels[x]) - change;
    std::fill_n(sums, width, 0.0);
    std::fill_n(squares, width, 0.0);
    return;
  }
  for (int x = 0; x < width; ++x) {
    const double deviation = (static_cast<double>(pixels[x]) - change) - origin[x];
    sums[x] += deviation;
    squares[x] += deviation * deviation;
  }
}

/// What one thread works in.
template <class T>
struct Workspace {
  std::vector<T> rows;         ///< of one frame, full width
  std::vector<SumOf<T>> sums;  ///< [region][row of the band in the region][column]
  SquareSums squares;          ///< likewise
  Extremes<T> extremes;        ///< likewise
};

/// A part of a region in a band, and where its sums begin.
struct Part {
  int region = 0;
  RowRange rows;
  std::size_t at = 0;
};

template <class T>
class Averager {
 public:
  Averager(const FrameStack& frames, const std::vector<Rect>& regions, const MeanFrameOptions& options);
  Result<std::vector<PixelMeans>> run();

 private:
  Status choose_levels();
  Status average(const RowRange& band, int worker);
  Status finish(const RowRange& band, const Part& part, int worker);
  void leave_hits_out(const Part& part, int worker);
  double hit_limit(int region) const {
    return options_.hit_limits.empty() || frames_.frames() < 2
               ? 0.0
               : options_.hit_limits[static_cast<std::size_t>(region)];
  }
  Error bad_pixel(const RowRange& band, const Part& part, double mean, int worker) const;

  /// Pixel (x, y) in rows read from row `from` on.
  const T* pixels_at(const std::vector<T>& rows, int from, int y, int x) const {
    return rows.data() + static_cast<std::size_t>(y - from) * static_cast<std::size_t>(shape_.width) + x;
  }
  Status read(int frame, const RowRange& rows, int worker, std::vector<T>& into) const {
    const std::size_t wanted = static_cast<std::size_t>(shape_.width) * static_cast<std::size_t>(rows.rows);
    if (into.size() < wanted) into.resize(wanted);
    return frames_.read_rows(frame, rows.y, rows.rows, into.data(), worker);
  }

  const FrameStack& frames_;
  const FrameShape shape_;
  const MeanFrameOptions& options_;
  bool variances_;
  std::vector<std::vector<double>> changes_;  ///< [region][frame] of the frame's mean from the frames' mean
  std::vector<PixelMeans> out_;
  std::vector<Workspace<T>> workspaces_;
};

template <class T>
Averager<T>::Averager(const FrameStack& frames,
                      const std::vector<Rect>& regions,
                      const MeanFrameOptions& options)
    : frames_(frames),
      shape_(frames.shape()),
      options_(options),
      variances_(!options.frame_means.empty() && frames.frames() > 1),
      workspaces_(static_cast<std::size_t>(std::max(1, options.threads))) {
  assert(options.frame_means.empty() || options.frame_means.size() == regions.size());
  for (const Rect& rect : regions) {
    PixelMeans& means = out_.emplace_back();
    means.rect = rect;
    means.frames = frames.frames();
    // The threads touch the memory first: filling it here would cost as much as summing.
    means.mean = std::make_unique_for_overwrite<float[]>(means.pixels());
    if (variances_) means.variance = std::make_unique_for_overwrite<float[]>(means.pixels());
  }
  if (!variances_) return;
  for (std::vector<double> changes : options.frame_means) {
    assert(changes.size() == static_cast<std::size_t>(frames.frames()));
    const double mean =
        std::accumulate(changes.begin(), changes.end(), 0.0) / static_cast<double>(changes.size());
    for (double& change : changes) change -= mean;
    changes_.push_back(std::move(changes));
  }
}

/// Median of the middle row of the first frame: a float holds what is small to more digits.
template <class T>
Status Averager<T>::choose_levels() {
  std::vector<T>& row = workspaces_.front().rows;
  for (PixelMeans& means : out_) {
    const Rect& rect = means.rect;
    const int y = rect.y + rect.height / 2;
    if (const Status got = read(0, {y, 1}, 0, row); !got) return got;
    std::vector<double> values;
    for (const T pixel : std::span(pixels_at(row, y, y, rect.x), static_cast<std::size_t>(rect.width)))
      if (std::isfinite(static_cast<double>(pixel))) values.push_back(static_cast<double>(pixel));
    if (values.empty()) continue;  // the error comes with the sums
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    means.level_dn = *middle;
  }
  return Done{};
}

template <class T>
Status Averager<T>::average(const RowRange& band, int worker) {
  Workspace<T>& workspace = workspaces_[static_cast<std::size_t>(worker)];
  std::vector<Part> parts;
  std::size_t pixels = 0;
  for (std::size_t r = 0; r < out_.size(); ++r) {
    const Rect& rect = out_[r].rect;
    const int begin = std::max(band.y, rect.y);
    const int end = std::min(band.y + band.rows, rect.y + rect.height);
    if (begin >= end) continue;
    parts.push_back({static_cast<int>(r), {begin, end - begin}, pixels});
    pixels += static_cast<std::size_t>(rect.width) * static_cast<std::size_t>(end - begin);
  }
  if (workspace.sums.size() < pixels) workspace.sums.resize(pixels);
  if (variances_)
    for (std::vector<double>* sums :
         {&workspace.squares.origin, &workspace.squares.sums, &workspace.squares.squares})
      if (sums->size() < pixels) sums->resize(pixels);
  const bool hits =
      std::any_of(parts.begin(), parts.end(), [&](const Part& p) { return hit_limit(p.region) > 0; });
  if (hits)
    for (std::vector<T>* values :
         {&workspace.extremes.highest, &workspace.extremes.second, &workspace.extremes.lowest})
      if (values->size() < pixels) values->resize(pixels);
  for (int f = 0; f < frames_.frames(); ++f) {
    if (const Status got = read(f, band, worker, workspace.rows); !got) return got;
    for (const Part& part : parts) {
      const auto region = static_cast<std::size_t>(part.region);
      const Rect& rect = out_[region].rect;
      std::size_t at = part.at;
      for (int y = part.rows.y; y < part.rows.y + part.rows.rows; ++y) {
        const T* row = pixels_at(workspace.rows, band.y, y, rect.x);
        add_row(row, rect.width, f == 0, out_[region].level_dn, workspace.sums.data() + at);
        if (variances_)
          add_squares(row, rect.width, f == 0, changes_[region][static_cast<std::size_t>(f)], at,
                      workspace.squares);
        if (hit_limit(part.region) > 0) add_extremes(row, rect.width, f == 0, at, workspace.extremes);
        at += static_cast<std::size_t>(rect.width);
      }
    }
  }
  for (const Part& part : parts)
    if (const Status done = finish(band, part, worker); !done) return done;
  return Done{};
}

template <class T>
Status Averager<T>::finish(const RowRange& band, const Part& part, int worker) {
  const Workspace<T>& workspace = workspaces_[static_cast<std::size_t>(worker)];
  PixelMeans& means = out_[static_cast<std::size_t>(part.region)];
  const auto width = static_cast<std::size_t>(means.rect.width);
  const std::size_t count = width * static_cast<std::size_t>(part.rows.rows);
  const std::size_t to = width * static_cast<std::size_t>(part.rows.y - means.rect.y);
  const double frames = frames_.frames();
  const SumOf<T>* sums = workspace.sums.data() + part.at;
  float* mean = means.mean.get() + to;
  // Floating pixels came without the level; of integers it is taken out here, where that is exact.
  const double level = std::is_floating_point_v<T> ? 0.0 : frames * means.level_dn;
  for (std::size_t i = 0; i < count; ++i)
    mean[i] = static_cast<float>((static_cast<double>(sums[i]) - level) / frames);
  if constexpr (std::is_floating_point_v<T>)
    for (std::size_t i = 0; i < count; ++i)
      if (!std::isfinite(mean[i])) return bad_pixel(band, part, sums[i] / frames + means.level_dn, worker);
  if (hit_limit(part.region) > 0) leave_hits_out(part, worker);
  if (!variances_) return Done{};
  const double* deviations = workspace.squares.sums.data() + part.at;
  const double* squares = workspace.squares.squares.data() + part.at;
  float* variance = means.variance.get() + to;
  for (std::size_t i = 0; i < count; ++i)
    variance[i] = static_cast<float>(
        std::max(0.0, (squares[i] - deviations[i] * deviations[i] / frames) / (frames - 1)));
  return Done{};
}

/// The rule of accumulate(), with one limit for the region.
template <class T>
void Averager<T>::leave_hits_out(const Part& part, int worker) {
  constexpr double kAgreement = 2.5;
  const Extremes<T>& extremes = workspaces_[static_cast<std::size_t>(worker)].extremes;
  PixelMeans& means = out_[static_cast<std::size_t>(part.region)];
  const auto width = static_cast<std::size_t>(means.rect.width);
  const std::size_t count = width * static_cast<std::size_t>(part.rows.rows);
  float* mean = means.mean.get() + width * static_cast<std::size_t>(part.rows.y - means.rect.y);
  const double frames = frames_.frames();
  const double limit = hit_limit(part.region);
  for (std::size_t i = 0; i < count; ++i) {
    const double highest = static_cast<double>(extremes.highest[part.at + i]) - means.level_dn;
    const double others = (frames * static_cast<double>(mean[i]) - highest) / (frames - 1);
    if (highest - others <= limit) continue;
    const double range =
        static_cast<double>(extremes.second[part.at + i]) - static_cast<double>(extremes.lowest[part.at + i]);
    if (highest - others > kAgreement * range) mean[i] = static_cast<float>(others);
  }
}

/// Which frame it was: only frames with such a pixel are read again, and only then.
template <class T>
Error Averager<T>::bad_pixel(const RowRange& band, const Part& part, double mean, int worker) const {
  const Rect& rect = out_[static_cast<std::size_t>(part.region)].rect;
  std::vector<T> rows;
  for (int f = 0; f < frames_.frames(); ++f) {
    if (const Status got = read(f, band, worker, rows); !got) return got.error();
    for (int y = part.rows.y; y < part.rows.y + part.rows.rows; ++y) {
      const T* row = pixels_at(rows, band.y, y, rect.x);
      if (!std::all_of(row, row + rect.width, [](T pixel) { return std::isfinite(pixel); }))
        return frames_.error_at(f, "found a pixel that is not a finite number, expected finite pixels");
    }
  }
  return frames_.error_at(
      0, "found a pixel with a mean of " + to_text(mean, 3) + " over its series, expected less than 3.4e+38");
}

template <class T>
Result<std::vector<PixelMeans>> Averager<T>::run() {
  if (const Status chosen = choose_levels(); !chosen) return chosen.error();
  std::vector<Rect> rects;
  for (const PixelMeans& means : out_) rects.push_back(means.rect);
  const std::vector<RowRange> bands =
      make_bands(shape_, rects, frames_.rows_apart(), variances_ ? kBandPixelsWithSquares : kBandPixels);
  const Status done = for_each_item(
      static_cast<int>(bands.size()), options_.threads,
      [&](int item, int worker) { return average(bands[static_cast<std::size_t>(item)], worker); });
  if (!done) return done.error();
  return std::move(out_);
}

template <class T>
Result<std::vector<PixelMeans>> run_for(const FrameStack& frames,
                                        const std::vector<Rect>& regions,
                                        const MeanFrameOptions& options) {
  return Averager<T>(frames, regions, options).run();
}

}  // namespace

Result<std::vector<PixelMeans>> mean_frame(const FrameStack& frames,
                                           const std::vector<Rect>& regions,
                                           const MeanFrameOptions& options) {
  if (frames.frames() > kMostFrames)
    return frames.error_at(kMostFrames, "found more than " + std::to_string(kMostFrames) +
                                            " frames in one series, expected fewer; split the series");
  switch (frames.shape().type) {
    case PixelType::u8:
      return run_for<std::uint8_t>(frames, regions, options);
    case PixelType::i8:
      return run_for<std::int8_t>(frames, regions, options);
    case PixelType::u16:
      return run_for<std::uint16_t>(frames, regions, options);
    case PixelType::i16:
      return run_for<std::int16_t>(frames, regions, options);
    case PixelType::u32:
      return run_for<std::uint32_t>(frames, regions, options);
    case PixelType::i32:
      return run_for<std::int32_t>(frames, regions, options);
    case PixelType::f32:
      return run_for<float>(frames, regions, options);
    case PixelType::f64:
      return run_for<double>(frames, regions, options);
  }
  return frames.error_at(0, "found an unknown type of pixels");
}

double median_deviation(std::span<float> values) {
  assert(!values.empty());
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  const double upper = std::sqrt(static_cast<double>(*middle));
  if (values.size() % 2 == 1) return upper;
  return (upper + std::sqrt(static_cast<double>(*std::max_element(values.begin(), middle)))) / 2;
}

double log_deviation_variance(std::span<float> values) {
  assert(!values.empty());
  const auto at = [&](double share) {
    const auto place =
        values.begin() + static_cast<std::ptrdiff_t>(share * static_cast<double>(values.size() - 1));
    std::nth_element(values.begin(), place, values.end());
    return static_cast<double>(*place);
  };
  const double lower = at(0.25);
  const double upper = at(0.75);
  if (!(lower > 0)) return 0;
  constexpr double kQuartiles = 1.3489795;  // of a normal distribution, in its standard deviations
  const double spread = std::log(upper / lower) / 2 / kQuartiles;
  return spread * spread;
}

}  // namespace evenfield
