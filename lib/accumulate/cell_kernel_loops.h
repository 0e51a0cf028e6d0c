// The loops behind cell_kernel.h. Included by one translation unit per instruction set, each compiled with its own
// flags; all of it has internal linkage and it calls no templates of the standard library that might be emitted on
// their own, so that no linker can mix code of one set into another.
#include <cmath>
#include <type_traits>

#include "accumulate/cell_kernel.h"

#define XXH_INLINE_ALL
#include <xxhash.h>

namespace {

using namespace evenfield;

/// Integer pixels of up to 16 bits are centred into 16 bits: the middle of the cell's range as centre always fits.
template <class T>
constexpr bool kWhole = std::is_integral_v<T> && sizeof(T) <= 2;
template <class T>
using Centred = std::conditional_t<kWhole<T>, std::int16_t, double>;
/// Products of centred integers are summed in 32 bits for as long as they cannot overflow, then widened.
template <class T>
using Sum = std::conditional_t<kWhole<T>, std::int64_t, double>;

template <class T>
struct Workspace {
  using Value = std::conditional_t<kWhole<T>, std::int32_t, double>;
  alignas(64) std::array<std::array<Centred<T>, kCellPixels>, kGroupFrames> centred;
  alignas(64) std::array<Value, kCellPixels> highest;
  alignas(64) std::array<Value, kCellPixels> sum;
  alignas(64) std::array<double, kCellPixels> squares;
  alignas(64) std::array<double, kCellPixels> deviation_sums;
  Value* above() { return highest.data(); }
  Value* total() { return sum.data(); }
};

template <class T>
struct Range {
  T low;
  T high;
};

template <class T>
Range<T> range_of(const CellInput& cell) {
  const auto* first = static_cast<const T*>(cell.pixels[0]);
  Range<T> range{first[0], first[0]};
  for (int f = 0; f < cell.frames; ++f) {
    const auto* pixels = static_cast<const T*>(cell.pixels[static_cast<std::size_t>(f)]);
    for (int y = 0; y < cell.height; ++y) {
      const T* row = pixels + y * cell.stride;
      T low = range.low;
      T high = range.high;
      for (int x = 0; x < cell.width; ++x) {
        low = row[x] < low ? row[x] : low;
        high = row[x] > high ? row[x] : high;
      }
      range = {low, high};
    }
  }
  return range;
}

/// The first frame with a pixel that is not finite, or -1.
template <class T>
int frame_not_finite(const CellInput& cell) {
  for (int f = 0; f < cell.frames; ++f) {
    const auto* pixels = static_cast<const T*>(cell.pixels[static_cast<std::size_t>(f)]);
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (!std::isfinite(pixels[y * cell.stride + x])) return f;
  }
  return -1;
}

/// Whether the cell holds whole numbers, also where their type is a floating-point one: the same frames in another container
/// are then treated alike.
template <class T>
bool holds_whole_codes(const CellInput& cell) {
  if constexpr (std::is_floating_point_v<T>) {
    const auto* pixels = static_cast<const T*>(cell.pixels[0]);
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (pixels[y * cell.stride + x] != std::floor(pixels[y * cell.stride + x])) return false;
  }
  return true;
}

template <class T>
void count_extremes(const CellInput& cell, Range<T> range, CellStatistics& out) {
  std::int64_t low_count = 0;
  std::int64_t high_count = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const auto* pixels = static_cast<const T*>(cell.pixels[static_cast<std::size_t>(f)]);
    for (int y = 0; y < cell.height; ++y) {
      const T* row = pixels + y * cell.stride;
      // Counted in the pixel's own width, which vectorizes; a row of a cell has at most 128 pixels.
      using Count = std::conditional_t<std::is_integral_v<T>, std::make_unsigned_t<std::conditional_t<std::is_integral_v<T>, T, int>>, int>;
      Count low = 0;
      Count high = 0;
      for (int x = 0; x < cell.width; ++x) {
        low = static_cast<Count>(low + (row[x] == range.low ? 1 : 0));
        high = static_cast<Count>(high + (row[x] == range.high ? 1 : 0));
      }
      low_count += static_cast<std::int64_t>(low);
      high_count += static_cast<std::int64_t>(high);
    }
  }
  out.lowest = {static_cast<double>(range.low), low_count};
  out.highest = {static_cast<double>(range.high), high_count};
}

template <class T>
double centre_of(Range<T> range) {
  if constexpr (kWhole<T>)
    return static_cast<double>((static_cast<int>(range.low) + static_cast<int>(range.high) + 1) >> 1);
  else
    return std::is_integral_v<T> ? std::floor(0.5 * (static_cast<double>(range.low) + static_cast<double>(range.high)))
                                 : static_cast<double>(range.low);
}

template <class T>
void centre_pixels(const CellInput& cell, double centre, Workspace<T>& work) {
  for (int f = 0; f < cell.frames; ++f) {
    const auto* pixels = static_cast<const T*>(cell.pixels[static_cast<std::size_t>(f)]);
    Centred<T>* out = work.centred[static_cast<std::size_t>(f)].data();
    for (int y = 0; y < cell.height; ++y) {
      const T* row = pixels + y * cell.stride;
      Centred<T>* to = out + y * cell.width;
      if constexpr (kWhole<T>) {
        // Modulo 2^16, which is exact since the difference fits.
        const auto shift = static_cast<std::uint16_t>(static_cast<int>(centre));
        for (int x = 0; x < cell.width; ++x)
          to[x] = static_cast<std::int16_t>(static_cast<std::uint16_t>(static_cast<std::uint16_t>(row[x]) - shift));
      } else {
        for (int x = 0; x < cell.width; ++x) to[x] = static_cast<double>(row[x]) - centre;
      }
    }
  }
}

std::int64_t dot(const std::int16_t* a, const std::int16_t* b, int count, int chunk) {
  std::int64_t total = 0;
  for (int begin = 0; begin < count; begin += chunk) {
    const int end = begin + chunk < count ? begin + chunk : count;
    std::int32_t part = 0;
    for (int i = begin; i < end; ++i) part += static_cast<std::int32_t>(a[i]) * static_cast<std::int32_t>(b[i]);
    total += part;
  }
  return total;
}

double dot(const double* a, const double* b, int count, int) {
  // Four partial sums, in a fixed order, so that every instruction set gives the same bits.
  double part[4] = {0, 0, 0, 0};
  int i = 0;
  for (; i + 4 <= count; i += 4)
    for (int k = 0; k < 4; ++k) part[k] += a[i + k] * b[i + k];
  for (int k = 0; i < count; ++i, ++k) part[k] += a[i] * b[i];
  return (part[0] + part[1]) + (part[2] + part[3]);
}

std::int64_t sum(const std::int16_t* a, int count) {
  std::int32_t total = 0;  // at most 128 terms of 16 bits
  for (int i = 0; i < count; ++i) total += a[i];
  return total;
}

double sum(const double* a, int count) {
  double total = 0;
  for (int i = 0; i < count; ++i) total += a[i];
  return total;
}

/// Largest number of products |d|^2 that fit a 32 bit sum.
int chunk_for(double magnitude) {
  const double products = 2147483647.0 / (magnitude < 1 ? 1 : magnitude * magnitude);
  return products < kCellPixels ? static_cast<int>(products) : static_cast<int>(kCellPixels);
}

template <class T>
void sums_and_gram(const CellInput& cell, int chunk, const Workspace<T>& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  for (int i = 0; i < cell.frames; ++i) {
    const auto* a = work.centred[static_cast<std::size_t>(i)].data();
    Sum<T> total = 0;
    for (int y = 0; y < cell.height; ++y) {
      const Sum<T> row = sum(a + y * cell.width, cell.width);
      out.row_sums[static_cast<std::size_t>(i * kCellRows + y)] = static_cast<double>(row);
      total += row;
    }
    out.sums[static_cast<std::size_t>(i)] = static_cast<double>(total);
    for (int j = i; j < cell.frames; ++j) {
      const auto* b = work.centred[static_cast<std::size_t>(j)].data();
      out.gram[pair_index(i, j, cell.frames)] = static_cast<double>(dot(a, b, pixels, chunk));
    }
  }
}

/// Temporal sum of squares of the cell, each frame's mean taken out; its degrees of freedom are (pixels - 1)(frames - 1).
double temporal_squares(const CellInput& cell, const CellStatistics& s) {
  const double n = cell.width * cell.height;
  double own = 0;
  double all = 0;
  for (int i = 0; i < cell.frames; ++i)
    for (int j = i; j < cell.frames; ++j) {
      const double g = s.gram[pair_index(i, j, cell.frames)] -
                       s.sums[static_cast<std::size_t>(i)] * s.sums[static_cast<std::size_t>(j)] / n;
      if (i == j) own += g;
      all += i == j ? g : 2 * g;
    }
  const double squares = own - all / cell.frames;
  return squares > 0 ? squares : 0;
}

/// Limit for frames x (highest deviation) - (sum of deviations), which is (frames - 1) times the distance of the highest
/// frame from the mean of the others. Two codes more for whole numbers: coarse steps are no hits.
double hit_limit(const CellInput& cell, bool whole_codes, double variance) {
  return cell.hit_threshold * std::sqrt(variance > 0 ? variance * cell.frames * (cell.frames - 1.0) : 0.0) +
         (whole_codes ? 2.0 * (cell.frames - 1.0) : 0.0);
}

/// So many pixels of a cell may be hits; more are a structure that one variance does not describe.
int most_hits(int pixels) { return pixels / 32 > 4 ? pixels / 32 : 4; }

/// The `rank`-th largest of `count` values (from 0), which are reordered.
double select_largest(double* values, int count, int rank) {
  int low = 0;
  int high = count - 1;
  while (low < high) {
    const double pivot = values[low + (high - low) / 2];
    int i = low;
    int j = high;
    while (i <= j) {
      while (values[i] > pivot) ++i;
      while (values[j] < pivot) --j;
      if (i <= j) {
        const double swapped = values[i];
        values[i++] = values[j];
        values[j--] = swapped;
      }
    }
    if (rank <= j)
      high = j;
    else if (rank >= i)
      low = i;
    else
      break;
  }
  return values[rank];
}

/// Temporal variance of the cell without the pixels of largest squares, as many as may be hits: never a variance that contains
/// what is judged by it. Leaving out the largest of clean pixels makes it smaller, by a quarter at most for two frames.
template <class T>
double trimmed_variance(const CellInput& cell, Workspace<T>& work, const CellStatistics& s) {
  const int pixels = cell.width * cell.height;
  const int left_out = most_hits(pixels);
  if (pixels <= 2 * left_out) return 0;
  double* squares = work.squares.data();
  double* sums = work.deviation_sums.data();
  for (int f = 0; f < cell.frames; ++f) {
    const auto* d = work.centred[static_cast<std::size_t>(f)].data();
    const double mean = s.sums[static_cast<std::size_t>(f)] / pixels;
    for (int p = 0; p < pixels; ++p) {
      const double e = static_cast<double>(d[p]) - mean;
      squares[p] = f == 0 ? e * e : squares[p] + e * e;
      sums[p] = f == 0 ? e : sums[p] + e;
    }
  }
  for (int p = 0; p < pixels; ++p) squares[p] -= sums[p] * sums[p] / cell.frames;
  select_largest(squares, pixels, left_out);
  double kept = 0;
  for (int p = left_out; p < pixels; ++p) kept += squares[p];
  return kept / ((pixels - left_out) * (cell.frames - 1.0));
}

/// One pixel of the cell through the frames of the group, each frame's mean taken out.
struct PixelSeries {
  double deviation[kGroupFrames];
  int highest = 0;
  double others_mean = 0;   ///< of all frames but the highest
  double others_range = 0;
};

template <class T>
PixelSeries pixel_series(const CellInput& cell, const Workspace<T>& work, const CellStatistics& s, int p) {
  PixelSeries out;
  const double n = cell.width * cell.height;
  double sum_all = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    out.deviation[f] = static_cast<double>(work.centred[k][static_cast<std::size_t>(p)]) - s.sums[k] / n;
    sum_all += out.deviation[f];
    if (out.deviation[f] > out.deviation[out.highest]) out.highest = f;
  }
  double low = 0;
  double high = 0;
  bool begun = false;
  for (int f = 0; f < cell.frames; ++f) {
    const double d = out.deviation[f];
    if (f == out.highest) continue;
    low = !begun || d < low ? d : low;
    high = !begun || d > high ? d : high;
    begun = true;
  }
  out.others_mean = (sum_all - out.deviation[out.highest]) / (cell.frames - 1);
  out.others_range = high - low;
  return out;
}

/// Largest and sum over frames of each pixel's deviation from its frame's mean, to the nearest code for integers.
template <class T, class Value>
void scan_pixels(const CellInput& cell, const Workspace<T>& work, const CellStatistics& s, Value* above, Value* total) {
  const int pixels = cell.width * cell.height;
  for (int f = 0; f < cell.frames; ++f) {
    const auto* d = work.centred[static_cast<std::size_t>(f)].data();
    const double exact = s.sums[static_cast<std::size_t>(f)] / pixels;
    const Value m = static_cast<Value>(kWhole<T> ? std::floor(exact + 0.5) : exact);
    if (f == 0) {
      for (int p = 0; p < pixels; ++p) total[p] = above[p] = static_cast<Value>(d[p]) - m;
    } else {
      for (int p = 0; p < pixels; ++p) {
        const Value e = static_cast<Value>(d[p]) - m;
        above[p] = e > above[p] ? e : above[p];
        total[p] += e;
      }
    }
  }
}

/// Replaces hits; returns how many. A hit is a pixel whose highest frame stands above the mean of its other frames by more
/// than the threshold, while those others agree among themselves: a pixel that blinks, or a hot one with noise of its
/// own, is not a hit. Hits shift the frame means that all is judged by, so the caller asks again until there are none.
template <class T>
int replace_hits(const CellInput& cell, bool whole_codes, double squares, Workspace<T>& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  auto* above = work.above();
  auto* total = work.total();
  scan_pixels(cell, work, out, above, total);
  const auto score = [&](int p) { return static_cast<double>(above[p]) * cell.frames - static_cast<double>(total[p]); };
  double top_score = score(0);
  for (int p = 1; p < pixels; ++p) top_score = score(p) > top_score ? score(p) : top_score;
  // Most cells end here, at no cost. What rounding the means can hide is one code in `frames` frames; and the pixels
  // that may be hits hold so much of the squares at the most.
  const double frames = cell.frames;
  const double most_squares = most_hits(pixels) * top_score * top_score / (frames * (frames - 1));
  const double least = (squares - most_squares) / (pixels * (frames - 1));
  if (top_score + frames <= hit_limit(cell, whole_codes, 0.7 * least)) return 0;

  const double limit = hit_limit(cell, whole_codes, trimmed_variance(cell, work, out));
  const int most = most_hits(pixels);
  int found = 0;
  int hit_pixel[kCellPixels / 32 + 4];
  int hit_frame[kCellPixels / 32 + 4];
  for (int p = 0; p < pixels; ++p) {
    if (score(p) + frames <= limit) continue;
    const PixelSeries pixel = pixel_series(cell, work, out, p);
    const double distance = pixel.deviation[pixel.highest] - pixel.others_mean;
    constexpr double kAgreement = 2.5;
    if (distance * (frames - 1) <= limit || distance <= kAgreement * pixel.others_range) continue;
    if (found == most) return 0;
    hit_pixel[found] = p;
    hit_frame[found++] = pixel.highest;
  }
  // Frame means without the hits, which would otherwise leak into what replaces them.
  double clean_sum[kGroupFrames];
  int clean_pixels[kGroupFrames];
  for (int f = 0; f < cell.frames; ++f) {
    clean_sum[f] = out.sums[static_cast<std::size_t>(f)];
    clean_pixels[f] = pixels;
  }
  const auto value_of = [&](int f, int p) {
    return static_cast<double>(work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)]);
  };
  for (int i = 0; i < found; ++i) {
    clean_sum[hit_frame[i]] -= value_of(hit_frame[i], hit_pixel[i]);
    --clean_pixels[hit_frame[i]];
  }
  for (int i = 0; i < found; ++i) {
    double others = 0;
    for (int f = 0; f < cell.frames; ++f)
      if (f != hit_frame[i]) others += value_of(f, hit_pixel[i]) - clean_sum[f] / clean_pixels[f];
    const double value = others / (cell.frames - 1) + clean_sum[hit_frame[i]] / clean_pixels[hit_frame[i]];
    auto& stored = work.centred[static_cast<std::size_t>(hit_frame[i])][static_cast<std::size_t>(hit_pixel[i])];
    if constexpr (kWhole<T>) {
      const double whole = std::floor(value + 0.5);
      stored = static_cast<std::int16_t>(whole < -32768 ? -32768 : whole > 32767 ? 32767 : whole);
    } else {
      stored = whole_codes ? std::floor(value + out.centre + 0.5) - out.centre : value;
    }
    ++out.hits[static_cast<std::size_t>(hit_frame[i])];
  }
  return found;
}

template <class T>
void add_to_totals(const CellInput& cell, double centre, const Workspace<T>& work, CellTotals& totals) {
  const int pixels = cell.width * cell.height;
  if (cell.first_group) totals.centre = centre;
  const double shift = cell.frames * (centre - totals.centre);
  const auto add = [&](auto* total) {
    using Total = std::remove_reference_t<decltype(*total)>;
    const auto whole_shift = static_cast<Total>(shift);
    for (int f = 0; f < cell.frames; ++f) {
      const auto* d = work.centred[static_cast<std::size_t>(f)].data();
      if (f == 0 && cell.first_group)
        for (int p = 0; p < pixels; ++p) total[p] = static_cast<Total>(d[p]);
      else if (f == 0)
        for (int p = 0; p < pixels; ++p) total[p] += static_cast<Total>(d[p]) + whole_shift;
      else
        for (int p = 0; p < pixels; ++p) total[p] += static_cast<Total>(d[p]);
    }
  };
  if constexpr (kWhole<T>)
    add(totals.whole.data());
  else
    add(totals.real.data());
}

template <class T>
void measure_cell(const CellInput& cell, CellTotals& totals, CellStatistics& out) {
  static thread_local Workspace<T> work;
  out.hits.fill(0);
  out.bad_frame = -1;
  if constexpr (std::is_floating_point_v<T>) {
    out.bad_frame = frame_not_finite<T>(cell);
    if (out.bad_frame >= 0) return;
  }
  const Range<T> range = range_of<T>(cell);
  count_extremes(cell, range, out);
  out.centre = centre_of(range);
  centre_pixels(cell, out.centre, work);
  const double up = static_cast<double>(range.high) - out.centre;
  const double down = out.centre - static_cast<double>(range.low);
  const double magnitude = up > down ? up : down;
  const int chunk = chunk_for(magnitude);
  sums_and_gram(cell, chunk, work, out);
  if (cell.hit_threshold > 0 && cell.frames > 1) {
    const double spread = static_cast<double>(range.high) - static_cast<double>(range.low);
    const bool whole_codes = holds_whole_codes<T>(cell);
    constexpr int kRounds = 8;  // each finds what the larger hits of the round before had hidden
    for (int round = 0; round < kRounds; ++round) {
      const double squares = temporal_squares(cell, out);
      // No pixel can stand out by more than the cell's whole range, nor pixels owe more than that to the squares.
      const int pixels = cell.width * cell.height;
      const double most = most_hits(pixels) * spread * spread * (cell.frames - 1) / cell.frames;
      const double least = 0.7 * (squares - most) / (pixels * (cell.frames - 1.0));
      if (spread * (cell.frames - 1) <= hit_limit(cell, whole_codes, least)) break;
      if (replace_hits(cell, whole_codes, squares, work, out) == 0) break;
      sums_and_gram(cell, chunk, work, out);
    }
  }
  add_to_totals(cell, out.centre, work, totals);
}

template <class T>
void square_totals(const CellTotals& totals, int width, int height, CellSquares& out) {
  out.square = 0;
  out.sum = 0;
  out.column_sums.fill(0);
  for (int y = 0; y < height; ++y) {
    double square = 0;
    double row_sum = 0;
    for (int x = 0; x < width; ++x) {
      const auto p = static_cast<std::size_t>(y * width + x);
      double total = 0;
      if constexpr (kWhole<T>)
        total = totals.whole[p];
      else
        total = totals.real[p];
      square += total * total;
      row_sum += total;
      out.column_sums[static_cast<std::size_t>(x)] += total;
    }
    out.square += square;
    out.sum += row_sum;
  }
}

std::array<std::uint64_t, 2> hash_row(const void* row, std::size_t bytes, std::uint64_t seed) {
  const XXH128_hash_t hash = XXH3_128bits_withSeed(row, bytes, seed);
  return {hash.low64, hash.high64};
}

CellKernels kernels_for(PixelType type) {
  switch (type) {
    case PixelType::u8: return {measure_cell<std::uint8_t>, square_totals<std::uint8_t>, hash_row};
    case PixelType::i8: return {measure_cell<std::int8_t>, square_totals<std::int8_t>, hash_row};
    case PixelType::u16: return {measure_cell<std::uint16_t>, square_totals<std::uint16_t>, hash_row};
    case PixelType::i16: return {measure_cell<std::int16_t>, square_totals<std::int16_t>, hash_row};
    case PixelType::u32: return {measure_cell<std::uint32_t>, square_totals<std::uint32_t>, hash_row};
    case PixelType::i32: return {measure_cell<std::int32_t>, square_totals<std::int32_t>, hash_row};
    case PixelType::f32: return {measure_cell<float>, square_totals<float>, hash_row};
    case PixelType::f64: return {measure_cell<double>, square_totals<double>, hash_row};
  }
  return {measure_cell<double>, square_totals<double>, hash_row};
}

}  // namespace
