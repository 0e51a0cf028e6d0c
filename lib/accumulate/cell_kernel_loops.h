#pragma once
// The loops behind cell_kernel.h. Included by one translation unit per instruction set, each compiled with
// its own flags, after the header with that set's loops over whole numbers. All of it has internal linkage
// and it calls no templates of the standard library that might be emitted on their own, so that no linker can
// mix code of one set into another.
#include "accumulate/cell_hits.h"
#include "accumulate/cell_neighbours.h"

#define XXH_INLINE_ALL
#include <xxhash.h>

namespace {

/// A whole number amid the codes of the cell, from a few of them; false if they are not whole.
template <class T>
bool sample_centre(const CellInput& cell, std::int64_t& centre) {
  std::int64_t low = 0;
  std::int64_t high = 0;
  if (!whole_number(*row_of<T>(cell, 0, 0), low)) return false;
  high = low;
  for (const int y : {0, cell.height / 2, cell.height - 1})
    for (const int x : {0, cell.width / 2, cell.width - 1}) {
      std::int64_t code = 0;
      if (!whole_number(row_of<T>(cell, 0, y)[x], code)) return false;
      low = code < low ? code : low;
      high = code > high ? code : high;
    }
  centre = (low + high + 1) >> 1;
  return true;
}

inline bool fits_short(const WholeRange& range, std::int64_t centre) {
  return range.low - centre >= -32768 && range.high - centre <= 32767;
}

inline void put_sums(const CellInput& cell, const WholeSums& sums, CellStatistics& out) {
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    std::int32_t total = 0;
    for (int y = 0; y < cell.height; ++y) {
      total += sums.rows[f][y];
      out.row_sums[k * kCellRows + static_cast<std::size_t>(y)] = sums.rows[f][y];
    }
    out.sums[k] = total;
    out.squares[k] = static_cast<double>(sums.squares[f]);
  }
}

inline void rounded_means(const CellInput& cell, const CellStatistics& s, int* mean) {
  const int pixels = cell.width * cell.height;
  for (int f = 0; f < cell.frames; ++f)
    mean[f] = static_cast<int>(std::floor(s.sums[static_cast<std::size_t>(f)] / pixels + 0.5));
}

/// Totals and sums across frames; returns how far above its mean over the frames no pixel's highest frame is,
/// each frame's mean taken out.
inline double across(const CellInput& cell, double magnitude, WholeWorkspace& work, CellStatistics& out) {
  int mean[kGroupFrames];
  rounded_means(cell, out, mean);
  WholeAcross seen;
  whole_across(cell, mean, static_cast<int>(magnitude), work, seen);
  for (int f = 0; f < cell.frames; ++f)
    out.with_total[static_cast<std::size_t>(f)] = static_cast<double>(seen.with_total[f]);
  return seen.above_mean;
}
inline double across(const CellInput& cell, double, RealWorkspace& work, CellStatistics& out) {
  return real_across(cell, work, out);
}

/// No centred pixel is larger.
template <class C>
double magnitude_of(const CellInput& cell, const Workspace<C>& work) {
  C most = 0;
  for (int f = 0; f < cell.frames; ++f)
    for (int p = 0; p < cell.width * cell.height; ++p) {
      const C d = work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)];
      const C size =
          static_cast<C>(d < 0 ? -(d + 1) : d);  // -32768 has no opposite; one less is made good below
      most = size > most ? size : most;
    }
  return static_cast<double>(most) + 1;
}

inline std::int64_t count_of(const CellInput& cell, const WholeWorkspace& work, double code) {
  return whole_count(cell, work, static_cast<std::int16_t>(code));
}
inline std::int64_t count_of(const CellInput& cell, const RealWorkspace& work, double code) {
  return real_count(cell, work, code);
}

/// An extreme that some other cell of the block is known to exceed is not worth counting.
template <class Work>
void find_extremes(const CellInput& cell, double low, double high, const Work& work, CellStatistics& out) {
  out.lowest = {low, 0};
  out.highest = {high, 0};
  if (!(low > cell.known_lowest)) out.lowest.count = count_of(cell, work, low - out.centre);
  if (!(high < cell.known_highest)) out.highest.count = count_of(cell, work, high - out.centre);
}

/// Sums across frames, and hits set aside before. Nearly all cells end at the first question.
template <class C>
void across_without_hits(
    const CellInput& cell, bool whole_codes, double magnitude, Workspace<C>& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  const double frames = cell.frames;
  double above_mean = across(cell, magnitude, work, out);
  if (!(cell.hit_threshold > 0) || cell.frames < 2) return;
  constexpr int kRounds = 8;  // each finds what larger hits have hidden by shifting the frame means
  for (int round = 0; round < kRounds; ++round) {
    // The variance that remains when as many pixels as may be hits owe the most that this allows to the
    // squares; the largest of clean pixels are trimmed too, which takes a quarter at most. A frame at the
    // distance a above the mean of all frames adds a^2 F / (F - 1) to the squares.
    const double most = most_hits(pixels) * above_mean * above_mean * frames / (frames - 1);
    const double least = 0.7 * (temporal_squares(cell, out) - most) / (pixels * (frames - 1));
    if (frames * above_mean <= hit_limit(cell, whole_codes, least)) return;
    if (replace_hits(cell, whole_codes, work, out) == 0) return;
    if constexpr (std::is_same_v<C, double>) real_sums(cell, work, out);  // rounding, where a hit was large
    magnitude = magnitude_of(cell, work);
    above_mean = across(cell, magnitude, work, out);
  }
}

template <class T>
auto* totals_of(CellTotals& totals) {
  if constexpr (kShort<T>)
    return totals.whole.data();
  else
    return totals.real.data();
}

template <class T>
void add_to_totals(
    const CellInput& cell, double centre, double magnitude, const T* total, auto* into, CellTotals& totals) {
  const int pixels = cell.width * cell.height;
  if (cell.first_group) {
    totals.centre = centre;
    totals.magnitude = 0;
  }
  const double shift = cell.frames * (centre - totals.centre);
  totals.magnitude += cell.frames * magnitude + std::fabs(shift);
  using Into = std::remove_reference_t<decltype(*into)>;
  const auto add = static_cast<Into>(shift);
  if (cell.first_group)
    for (int p = 0; p < pixels; ++p) into[p] = static_cast<Into>(total[p]);
  else
    for (int p = 0; p < pixels; ++p) into[p] += static_cast<Into>(total[p]) + add;
}

/// Column sums and the sum of all; sums of whole numbers are exact.
template <class T>
void sum_columns(const CellInput& cell, const T* total, CellSquares& out) {
  using Sum = std::conditional_t<std::is_same_v<T, double>, double, std::int32_t>;
  constexpr int kTogether = 32;  // as many columns as registers hold
  double* columns = out.column_sums.data();
  int x = 0;
  for (; x + kTogether <= cell.width; x += kTogether) {
    Sum sum[kTogether] = {};
    for (int y = 0; y < cell.height; ++y)
      for (int k = 0; k < kTogether; ++k) sum[k] += total[y * cell.width + x + k];
    for (int k = 0; k < kTogether; ++k) columns[x + k] = static_cast<double>(sum[k]);
  }
  for (; x < cell.width; ++x) {
    Sum sum = 0;
    for (int y = 0; y < cell.height; ++y) sum += total[y * cell.width + x];
    columns[x] = static_cast<double>(sum);
  }
  out.sum = real_sum(columns, cell.width);
}

/// Totals of whole numbers are whole numbers below 2^28: 512 frames of 8 rows fit 32 bits in a column. More
/// frames and sums of real pixels go by doubles.
template <class T>
void square_totals(const CellInput& cell, const CellTotals& totals, CellSquares& out) {
  const int pixels = cell.width * cell.height;
  out.centre = totals.centre;
  if constexpr (kShort<T>) {
    constexpr double kSquaresInWholes = 67108864.0;  // 2^26: 1024 squares of it fit 63 bits
    if (totals.magnitude < kSquaresInWholes) {
      sum_columns(cell, totals.whole.data(), out);
      out.square = static_cast<double>(whole_square(totals.whole.data(), pixels));
      return;
    }
    double real[kCellPixels] = {};
    for (int p = 0; p < pixels; ++p) real[p] = totals.whole[static_cast<std::size_t>(p)];
    sum_columns(cell, real, out);
    out.square = real_dot(real, real, pixels);
  } else {
    sum_columns(cell, totals.real.data(), out);
    out.square = real_dot(totals.real.data(), totals.real.data(), pixels);
  }
}

/// The end of a group, whole or real.
template <class T, class Work>
void finish_group(const CellInput& cell,
                  double magnitude,
                  const Work& work,
                  CellTotals& totals,
                  CellStatistics& out,
                  CellSquares& squares) {
  if (cell.first_group && cell.last_group) {
    sum_columns(cell, work.total.data(), squares);
    squares.centre = out.centre;
    squares.square = 0;
    for (int f = 0; f < cell.frames; ++f) squares.square += out.with_total[static_cast<std::size_t>(f)];
    return;
  }
  add_to_totals(cell, out.centre, magnitude, work.total.data(), totals_of<T>(totals), totals);
  if (cell.last_group) square_totals<T>(cell, totals, squares);
}

/// False if the cell holds other than whole numbers that fit 16 bits once centred: nothing is valid then.
template <class T>
bool measure_whole(const CellInput& cell,
                   CellTotals& totals,
                   WholeWorkspace& work,
                   CellStatistics& out,
                   CellSquares& squares) {
  std::int64_t centre = 0;
  if (!sample_centre<T>(cell, centre)) return false;
  WholeSums sums;
  WholeRange range = whole_gather<T>(cell, centre, work, sums);
  if (!range.whole) return false;
  if (!fits_short(range, centre)) {
    centre = (range.low + range.high + 1) >> 1;
    if (!fits_short(range, centre)) return false;
    range = whole_gather<T>(cell, centre, work, sums);
  }
  const auto up = static_cast<double>(range.high - centre);
  const auto down = static_cast<double>(centre - range.low);
  const double magnitude = up > down ? up : down;
  if (magnitude > kNarrow) wide_sums(cell, work, sums);
  out.centre = static_cast<double>(centre);
  out.bits = range.bits;
  put_sums(cell, sums, out);
  find_extremes(cell, static_cast<double>(range.low), static_cast<double>(range.high), work, out);
  across_without_hits(cell, true, magnitude, work, out);
  if (cell.first_group && cell.frames > 1) out.neighbours = whole_neighbours(cell, magnitude, out, work);
  finish_group<T>(cell, magnitude, work, totals, out, squares);
  return true;
}

template <class T>
void measure_real(const CellInput& cell,
                  CellTotals& totals,
                  RealWorkspace& work,
                  CellStatistics& out,
                  CellSquares& squares) {
  // A whole number as centre leaves whole codes whole.
  const auto first = static_cast<double>(*row_of<T>(cell, 0, 0));
  out.centre = std::isfinite(first) ? std::floor(first) : 0.0;
  RealRange range;
  if (!real_gather<T>(cell, out.centre, work, range)) {
    out.bad_frame = frame_not_finite<T>(cell);
    return;
  }
  const double up = range.high - out.centre;
  const double down = out.centre - range.low;
  out.bits = {};
  real_sums(cell, work, out);
  find_extremes(cell, range.low, range.high, work, out);
  const double magnitude = up > down ? up : down;
  across_without_hits(cell, holds_whole_codes<T>(cell), magnitude, work, out);
  if (cell.first_group && cell.frames > 1) out.neighbours = real_neighbours(cell, out, work);
  finish_group<T>(cell, magnitude, work, totals, out, squares);
}

/// A cell is measured in one of the two.
union CellWorkspace {
  WholeWorkspace whole;
  RealWorkspace real;
};

template <class T>
void measure_cell(
    const CellInput& cell, CellTotals& totals, void* workspace, CellStatistics& out, CellSquares& squares) {
  out.hits.fill(0);
  out.bad_frame = -1;
  out.neighbours = {};
  auto* work = static_cast<CellWorkspace*>(workspace);
  if (!measure_whole<T>(cell, totals, work->whole, out, squares)) {
    if constexpr (!kShort<T>) measure_real<T>(cell, totals, work->real, out, squares);
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
constexpr CellKernels kKernels{measure_cell<T>, kShort<T> ? sizeof(WholeWorkspace) : sizeof(CellWorkspace),
                               hash_row};

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
