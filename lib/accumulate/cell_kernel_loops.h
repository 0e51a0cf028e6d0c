#pragma once
// The loops behind cell_kernel.h. Included by one translation unit per instruction set, each compiled with
// its own flags, after the header with that set's loops over whole numbers. All of it has internal linkage
// and it calls no templates of the standard library that might be emitted on their own, so that no linker can
// mix code of one set into another.
#include "accumulate/cell_hits.h"
#include "accumulate/cell_workspace.h"

#define XXH_INLINE_ALL
#include <xxhash.h>

namespace {

/// The first frame with a pixel that is not finite, or -1.
template <class T>
int frame_not_finite(const CellInput& cell) {
  for (int f = 0; f < cell.frames; ++f)
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (!std::isfinite(row_of<T>(cell, f, y)[x])) return f;
  return -1;
}

/// Whether the cell holds whole numbers, also where their type is a floating-point one: the same frames in
/// another container are then treated alike.
template <class T>
bool holds_whole_codes(const CellInput& cell) {
  if constexpr (std::is_floating_point_v<T>) {
    for (int y = 0; y < cell.height; ++y)
      for (int x = 0; x < cell.width; ++x)
        if (row_of<T>(cell, 0, y)[x] != std::floor(row_of<T>(cell, 0, y)[x])) return false;
  }
  return true;
}

/// Range of the cell's pixels, which go into `work` on the way: whole ones as they are, real ones as doubles.
template <class T>
Range<T> gather(const CellInput& cell, Workspace<Centred<T>>& work) {
  if constexpr (kWhole<T>) {
    return whole_gather<T>(cell, work);
  } else {
    Range<T> range{*row_of<T>(cell, 0, 0), *row_of<T>(cell, 0, 0)};
    for (int f = 0; f < cell.frames; ++f) {
      double* to = work.centred[static_cast<std::size_t>(f)].data();
      for (int y = 0; y < cell.height; ++y, to += cell.width) {
        const T* row = row_of<T>(cell, f, y);
        for (int x = 0; x < cell.width; ++x) {
          range.low = row[x] < range.low ? row[x] : range.low;
          range.high = row[x] > range.high ? row[x] : range.high;
          to[x] = static_cast<double>(row[x]);
        }
      }
    }
    return range;
  }
}

template <class T>
double centre_of(Range<T> range) {
  if constexpr (kWhole<T>)
    return static_cast<double>((static_cast<int>(range.low) + static_cast<int>(range.high) + 1) >> 1);
  else
    return std::is_integral_v<T>
               ? std::floor(0.5 * (static_cast<double>(range.low) + static_cast<double>(range.high)))
               : static_cast<double>(range.low);
}

template <class C>
void centre_pixels(const CellInput& cell, double centre, Workspace<C>& work) {
  const int pixels = cell.width * cell.height;
  if constexpr (std::is_same_v<C, std::int16_t>) {
    whole_centre(cell.frames, pixels, static_cast<int>(centre), work);
  } else {
    for (int f = 0; f < cell.frames; ++f) {
      double* d = work.centred[static_cast<std::size_t>(f)].data();
      for (int p = 0; p < pixels; ++p) d[p] -= centre;
    }
  }
}

/// How many pixels are `code`.
template <class C>
std::int64_t count_of(const CellInput& cell, double code, double centre, const Workspace<C>& work) {
  const int pixels = cell.width * cell.height;
  if constexpr (std::is_same_v<C, std::int16_t>) {
    return whole_count(work, cell.frames, pixels, static_cast<std::int16_t>(code - centre));
  } else {
    std::int64_t total = 0;
    for (int f = 0; f < cell.frames; ++f)
      for (int p = 0; p < pixels; ++p)
        total +=
            work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)] == code - centre ? 1 : 0;
    return total;
  }
}

/// An extreme that some other cell of the block is known to exceed is not worth counting.
template <class C>
void find_extremes(
    const CellInput& cell, double low, double high, const Workspace<C>& work, CellStatistics& out) {
  out.lowest = {low, 0};
  out.highest = {high, 0};
  if (!(low > cell.known_lowest)) out.lowest.count = count_of(cell, low, out.centre, work);
  if (!(high < cell.known_highest)) out.highest.count = count_of(cell, high, out.centre, work);
}

inline double real_sum(const double* row, int width) {
  double total = 0;
  for (int x = 0; x < width; ++x) total += row[x];
  return total;
}

inline double real_dot(const double* a, const double* b, int count) {
  // Eight partial sums, in a fixed order, so that every instruction set gives the same bits.
  double part[8] = {0, 0, 0, 0, 0, 0, 0, 0};
  int i = 0;
  for (; i + 8 <= count; i += 8)
    for (int k = 0; k < 8; ++k) part[k] += a[i + k] * b[i + k];
  for (int k = 0; i < count; ++i, ++k) part[k] += a[i] * b[i];
  return ((part[0] + part[1]) + (part[2] + part[3])) + ((part[4] + part[5]) + (part[6] + part[7]));
}

template <class C>
void sums_and_gram(const CellInput& cell, double magnitude, const Workspace<C>& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  constexpr bool kIsWhole = std::is_same_v<C, std::int16_t>;
  for (int f = 0; f < cell.frames; ++f) {
    const C* row = work.centred[static_cast<std::size_t>(f)].data();
    double* sums = out.row_sums.data() + f * kCellRows;
    if constexpr (kIsWhole) {
      std::int32_t whole[kCellRows];
      whole_row_sums(row, cell.width, cell.height, magnitude, whole);
      for (int y = 0; y < cell.height; ++y) sums[y] = whole[y];
    } else {
      for (int y = 0; y < cell.height; ++y, row += cell.width) sums[y] = real_sum(row, cell.width);
    }
    double total = 0;
    for (int y = 0; y < cell.height; ++y) total += sums[y];
    out.sums[static_cast<std::size_t>(f)] = total;
  }
  if constexpr (kIsWhole) {
    std::int64_t gram[pair_count(kGroupFrames)];
    whole_gram(work, cell.frames, padded(pixels), magnitude, gram);
    for (std::size_t k = 0; k < pair_count(cell.frames); ++k) out.gram[k] = static_cast<double>(gram[k]);
  } else {
    for (int i = 0; i < cell.frames; ++i)
      for (int j = i; j < cell.frames; ++j)
        out.gram[pair_index(i, j, cell.frames)] =
            real_dot(work.centred[static_cast<std::size_t>(i)].data(),
                     work.centred[static_cast<std::size_t>(j)].data(), pixels);
  }
}

/// No pixel stands out by more than the result, which is the largest range of any pixel over the frames of
/// the group.
template <class C>
double deviation_range(const CellInput& cell, const Workspace<C>& work, const CellStatistics& s) {
  const int pixels = cell.width * cell.height;
  if constexpr (std::is_same_v<C, std::int16_t>) {
    int mean[kGroupFrames];
    for (int f = 0; f < cell.frames; ++f)
      mean[f] = static_cast<int>(std::floor(s.sums[static_cast<std::size_t>(f)] / pixels + 0.5));
    return whole_deviation_range(work, cell.frames, pixels, mean) + 1;  // what rounding the means can hide
  } else {
    double widest = 0;
    for (int p = 0; p < pixels; ++p) {
      double low = 0;
      double high = 0;
      for (int f = 0; f < cell.frames; ++f) {
        const auto k = static_cast<std::size_t>(f);
        const double e = work.centred[k][static_cast<std::size_t>(p)] - s.sums[k] / pixels;
        low = f == 0 || e < low ? e : low;
        high = f == 0 || e > high ? e : high;
      }
      widest = high - low > widest ? high - low : widest;
    }
    return widest;
  }
}

/// Sets hits aside. Nearly all cells end at one of the first two questions.
template <class C>
void set_hits_aside(const CellInput& cell,
                    bool whole_codes,
                    double spread,
                    double magnitude,
                    Workspace<C>& work,
                    CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  // The variance that remains when as many pixels as may be hits owe the most that this range allows to the
  // squares; the largest of clean pixels are trimmed too, which takes a quarter at most.
  const auto least_limit = [&](double range) {
    const double most = most_hits(pixels) * range * range * (cell.frames - 1) / cell.frames;
    const double least = 0.7 * (temporal_squares(cell, out) - most) / (pixels * (cell.frames - 1.0));
    return hit_limit(cell, whole_codes, least);
  };
  if (spread * (cell.frames - 1) <= least_limit(spread)) return;
  constexpr int kRounds = 8;  // each finds what larger hits have hidden by shifting the frame means
  for (int round = 0; round < kRounds; ++round) {
    const double range = deviation_range(cell, work, out);
    if (range * (cell.frames - 1) <= least_limit(range)) return;
    if (replace_hits(cell, whole_codes, work, out) == 0) return;
    sums_and_gram(cell, magnitude, work, out);
  }
}

template <class T>
void add_to_totals(const CellInput& cell,
                   double centre,
                   double magnitude,
                   const Workspace<Centred<T>>& work,
                   CellTotals& totals) {
  const int pixels = cell.width * cell.height;
  if (cell.first_group) {
    totals.centre = centre;
    totals.magnitude = 0;
  }
  const double shift = cell.frames * (centre - totals.centre);
  totals.magnitude += cell.frames * magnitude + std::fabs(shift);
  if constexpr (kWhole<T>) {
    whole_add(work, cell.frames, pixels, magnitude, cell.first_group, static_cast<int>(shift),
              totals.whole.data());
  } else {
    for (int f = 0; f < cell.frames; ++f) {
      const double* d = work.centred[static_cast<std::size_t>(f)].data();
      double* total = totals.real.data();
      if (f == 0 && cell.first_group)
        for (int p = 0; p < pixels; ++p) total[p] = d[p];
      else if (f == 0)
        for (int p = 0; p < pixels; ++p) total[p] += d[p] + shift;
      else
        for (int p = 0; p < pixels; ++p) total[p] += d[p];
    }
  }
}

template <class T>
void measure_cell(const CellInput& cell, CellTotals& totals, CellStatistics& out) {
  static thread_local Workspace<Centred<T>> work;
  out.hits.fill(0);
  out.bad_frame = -1;
  if constexpr (std::is_floating_point_v<T>) {
    out.bad_frame = frame_not_finite<T>(cell);
    if (out.bad_frame >= 0) return;
  }
  const Range<T> range = gather<T>(cell, work);
  const auto low = static_cast<double>(range.low);
  const auto high = static_cast<double>(range.high);
  out.centre = centre_of(range);
  centre_pixels(cell, out.centre, work);
  find_extremes(cell, low, high, work, out);
  const double up = high - out.centre;
  const double down = out.centre - low;
  const double magnitude = up > down ? up : down;
  sums_and_gram(cell, magnitude, work, out);
  if (cell.hit_threshold > 0 && cell.frames > 1)
    set_hits_aside(cell, holds_whole_codes<T>(cell), up + down, magnitude, work, out);
  add_to_totals<T>(cell, out.centre, magnitude, work, totals);
}

template <class T>
void square_totals(const CellTotals& totals, int width, int height, CellSquares& out) {
  out.square = 0;
  out.sum = 0;
  if constexpr (kWhole<T>) {
    constexpr double kSquaresInWholes = 67108864.0;  // 2^26: 2048 squares of it fit 63 bits
    std::array<std::int64_t, kCellColumns> columns{};
    for (int y = 0; y < height; ++y) {
      const std::int32_t* row = totals.whole.data() + y * width;
      for (int x = 0; x < width; ++x) columns[static_cast<std::size_t>(x)] += row[x];
    }
    for (int x = 0; x < width; ++x) {
      out.column_sums[static_cast<std::size_t>(x)] =
          static_cast<double>(columns[static_cast<std::size_t>(x)]);
      out.sum += static_cast<double>(columns[static_cast<std::size_t>(x)]);
    }
    if (totals.magnitude < kSquaresInWholes) {
      out.square = static_cast<double>(whole_square(totals.whole.data(), width * height));
    } else {
      for (int p = 0; p < width * height; ++p)
        out.square += static_cast<double>(totals.whole[static_cast<std::size_t>(p)]) *
                      totals.whole[static_cast<std::size_t>(p)];
    }
  } else {
    out.column_sums.fill(0);
    for (int y = 0; y < height; ++y)
      for (int x = 0; x < width; ++x)
        out.column_sums[static_cast<std::size_t>(x)] += totals.real[static_cast<std::size_t>(y * width + x)];
    for (int x = 0; x < width; ++x) out.sum += out.column_sums[static_cast<std::size_t>(x)];
    out.square = real_dot(totals.real.data(), totals.real.data(), width * height);
  }
}

/// The place of the row is mixed in after the row's own hash: a seeded hash would make a secret of its own
/// for each row.
inline std::array<std::uint64_t, 2> hash_row(const void* row, std::size_t bytes, std::uint64_t number) {
  const XXH128_hash_t plain = XXH3_128bits(row, bytes);
  const std::uint64_t placed[3] = {plain.low64, plain.high64, number};
  const XXH128_hash_t hash = XXH3_128bits(placed, sizeof placed);
  return {hash.low64, hash.high64};
}

template <class T>
constexpr CellKernels kKernels{measure_cell<T>, square_totals<T>, hash_row};

inline CellKernels kernels_for(PixelType type) {
  switch (type) {
    case PixelType::u8:
      return kKernels<std::uint8_t>;
    case PixelType::i8:
      return kKernels<std::int8_t>;
    case PixelType::u16:
      return kKernels<std::uint16_t>;
    case PixelType::i16:
      return kKernels<std::int16_t>;
    case PixelType::u32:
      return kKernels<std::uint32_t>;
    case PixelType::i32:
      return kKernels<std::int32_t>;
    case PixelType::f32:
      return kKernels<float>;
    case PixelType::f64:
      return kKernels<double>;
  }
  return kKernels<double>;
}

}  // namespace
