#pragma once
// Loops over whole numbers that fit 16 bits once centred, sixteen at a time. Part of cell_kernel_loops.h; see
// there. The same functions as in cell_whole_portable.h, where they are described.
#include <immintrin.h>

#include "accumulate/cell_whole_wide.h"

namespace {

inline constexpr int kLane = 16;

inline __m256i load(const void* p) { return _mm256_loadu_si256(static_cast<const __m256i*>(p)); }
inline void store(void* p, __m256i v) { _mm256_storeu_si256(static_cast<__m256i*>(p), v); }

inline std::int64_t sum_of_32(__m256i v) {
  const __m256i wide = _mm256_add_epi64(_mm256_cvtepi32_epi64(_mm256_castsi256_si128(v)),
                                        _mm256_cvtepi32_epi64(_mm256_extracti128_si256(v, 1)));
  const __m128i two = _mm_add_epi64(_mm256_castsi256_si128(wide), _mm256_extracti128_si256(wide, 1));
  return _mm_cvtsi128_si64(two) + _mm_extract_epi64(two, 1);
}

/// All ones in the first `count` lanes of 16 bits.
inline __m256i first_16(int count) {
  alignas(32) static constexpr std::int16_t kOnes[2 * kLane] = {-1, -1, -1, -1, -1, -1, -1, -1,
                                                                -1, -1, -1, -1, -1, -1, -1, -1};
  return load(kOnes + kLane - count);
}

/// All ones in the first `count` lanes of 32 bits, as many as there are; none if it is negative.
inline __m256i first_32(int count) {
  alignas(32) static constexpr std::int32_t kOnes[16] = {-1, -1, -1, -1, -1, -1, -1, -1};
  return load(kOnes + 8 - (count < 0 ? 0 : count > 8 ? 8 : count));
}

/// Codes of up to 16 bits, sixteen at a time, in lanes of 16; unsigned ones of 16 bits keep their bits.
template <class T>
struct ShortCodes {
  static constexpr bool kUnsigned16 = std::is_same_v<T, std::uint16_t>;
  __m256i first, low, high, any, all, shift;

  ShortCodes(T first_code, std::int64_t centre)
      : first(_mm256_set1_epi16(static_cast<std::int16_t>(first_code))),
        low(first),
        high(first),
        any(first),
        all(first),
        shift(_mm256_set1_epi16(static_cast<std::int16_t>(centre))) {}

  static __m256i codes(const T* p) {
    if constexpr (sizeof(T) == 2) {
      return load(p);
    } else {
      const __m128i bytes = _mm_loadu_si128(reinterpret_cast<const __m128i*>(p));
      return std::is_signed_v<T> ? _mm256_cvtepi8_epi16(bytes) : _mm256_cvtepu8_epi16(bytes);
    }
  }
  __m256i look(__m256i v) {
    low = kUnsigned16 ? _mm256_min_epu16(low, v) : _mm256_min_epi16(low, v);
    high = kUnsigned16 ? _mm256_max_epu16(high, v) : _mm256_max_epi16(high, v);
    any = _mm256_or_si256(any, v);
    all = _mm256_and_si256(all, v);
    return _mm256_sub_epi16(v, shift);
  }
  __m256i take(const T* p) { return look(codes(p)); }
  /// The first `count` of sixteen; zeros for the others.
  __m256i take_some(const T* p, int count) {
    const __m256i mask = first_16(count);
    return _mm256_and_si256(look(_mm256_blendv_epi8(first, codes(p), mask)), mask);
  }
  void finish(WholeRange& out) const {
    using Wide = std::conditional_t<kUnsigned16, std::uint16_t, std::int16_t>;
    Wide lows[kLane], highs[kLane], anys[kLane], alls[kLane];
    store(lows, low);
    store(highs, high);
    store(anys, any);
    store(alls, all);
    out.low = lows[0];
    out.high = highs[0];
    out.bits = {true, 0, ~std::uint64_t{0}};
    for (int i = 0; i < kLane; ++i) {
      out.low = lows[i] < out.low ? lows[i] : out.low;
      out.high = highs[i] > out.high ? highs[i] : out.high;
      out.bits.any |= static_cast<std::uint64_t>(std::int64_t{anys[i]});
      out.bits.all &= static_cast<std::uint64_t>(std::int64_t{alls[i]});
    }
  }
};

/// Codes of 32 bits, or floating-point numbers that are whole, eight at a time.
template <class T>
struct LongCodes {
  static constexpr bool kUnsigned32 = std::is_same_v<T, std::uint32_t>;
  __m256i first, low, high, any, all, shift, whole;

  LongCodes(T first_code, std::int64_t centre) {
    std::int64_t code = 0;
    const bool is_whole = whole_number(first_code, code);
    first = _mm256_set1_epi32(static_cast<std::int32_t>(code));
    low = high = any = all = first;
    shift = _mm256_set1_epi32(static_cast<std::int32_t>(centre));
    whole = _mm256_set1_epi32(is_whole ? -1 : 0);
  }

  /// What is not a whole number of 32 bits comes back from its conversion as something else.
  __m256i codes(const T* p, __m256i mask) {
    if constexpr (std::is_same_v<T, float>) {
      const __m256 v = _mm256_loadu_ps(p);
      const __m256i codes = _mm256_cvtps_epi32(v);
      const __m256 same = _mm256_cmp_ps(v, _mm256_cvtepi32_ps(codes), _CMP_EQ_OQ);
      // 2147483648 saturates to a code that is converted to the number itself with the other sign: unequal.
      whole = _mm256_and_si256(whole, _mm256_or_si256(_mm256_castps_si256(same), ~mask));
      return codes;
    } else if constexpr (std::is_same_v<T, double>) {
      const __m256d a = _mm256_loadu_pd(p);
      const __m256d b = _mm256_loadu_pd(p + 4);
      const __m128i x = _mm256_cvtpd_epi32(a);
      const __m128i y = _mm256_cvtpd_epi32(b);
      const __m256i same_a = _mm256_castpd_si256(_mm256_cmp_pd(a, _mm256_cvtepi32_pd(x), _CMP_EQ_OQ));
      const __m256i same_b = _mm256_castpd_si256(_mm256_cmp_pd(b, _mm256_cvtepi32_pd(y), _CMP_EQ_OQ));
      const __m256i same = _mm256_permute4x64_epi64(_mm256_packs_epi32(same_a, same_b), 0xD8);
      whole = _mm256_and_si256(whole, _mm256_or_si256(same, ~mask));
      return _mm256_set_m128i(y, x);
    } else {
      return load(p);
    }
  }
  __m256i look(__m256i v) {
    low = kUnsigned32 ? _mm256_min_epu32(low, v) : _mm256_min_epi32(low, v);
    high = kUnsigned32 ? _mm256_max_epu32(high, v) : _mm256_max_epi32(high, v);
    any = _mm256_or_si256(any, v);
    all = _mm256_and_si256(all, v);
    return _mm256_sub_epi32(v, shift);
  }
  __m256i take(const T* p) {
    const __m256i every = _mm256_set1_epi32(-1);
    const __m256i a = look(codes(p, every));
    const __m256i b = look(codes(p + 8, every));
    return _mm256_permute4x64_epi64(_mm256_packs_epi32(a, b), 0xD8);
  }
  __m256i take_some(const T* p, int count) {
    const __m256i mask_a = first_32(count);
    const __m256i mask_b = first_32(count - 8);
    const __m256i a = look(_mm256_blendv_epi8(first, codes(p, mask_a), mask_a));
    const __m256i b =
        count > 8 ? look(_mm256_blendv_epi8(first, codes(p + 8, mask_b), mask_b)) : _mm256_setzero_si256();
    return _mm256_and_si256(_mm256_permute4x64_epi64(_mm256_packs_epi32(a, b), 0xD8), first_16(count));
  }
  void finish(WholeRange& out) const {
    using Wide = std::conditional_t<kUnsigned32, std::uint32_t, std::int32_t>;
    Wide lows[8], highs[8], anys[8], alls[8];
    store(lows, low);
    store(highs, high);
    store(anys, any);
    store(alls, all);
    out.low = lows[0];
    out.high = highs[0];
    out.bits = {true, 0, ~std::uint64_t{0}};
    for (int i = 0; i < 8; ++i) {
      out.low = lows[i] < out.low ? lows[i] : out.low;
      out.high = highs[i] > out.high ? highs[i] : out.high;
      out.bits.any |= static_cast<std::uint64_t>(std::int64_t{anys[i]});
      out.bits.all &= static_cast<std::uint64_t>(std::int64_t{alls[i]});
    }
    out.whole = _mm256_movemask_epi8(whole) == -1;
  }
};

/// Sums of eight vectors, in its eight lanes.
inline __m256i sums_of_eight(const __m256i* v) {
  const __m256i first = _mm256_hadd_epi32(_mm256_hadd_epi32(v[0], v[1]), _mm256_hadd_epi32(v[2], v[3]));
  const __m256i last = _mm256_hadd_epi32(_mm256_hadd_epi32(v[4], v[5]), _mm256_hadd_epi32(v[6], v[7]));
  return _mm256_add_epi32(_mm256_permute2x128_si256(first, last, 0x20),
                          _mm256_permute2x128_si256(first, last, 0x31));
}

template <class T>
WholeRange whole_gather(const CellInput& cell, std::int64_t centre, WholeWorkspace& work, WholeSums& sums) {
  using Codes = std::conditional_t<kShort<T>, ShortCodes<T>, LongCodes<T>>;
  Codes codes(*row_of<T>(cell, 0, 0), centre);
  const int vectors = cell.width / kLane * kLane;
  const int rest = cell.width - vectors;
  const __m256i ones = _mm256_set1_epi16(1);
  static_assert(kCellRows == 16, "the rows of a frame end in the eight lanes of two vectors");
  for (int f = 0; f < cell.frames; ++f) {
    std::int16_t* to = work.centred[static_cast<std::size_t>(f)].data();
    __m256i squares = _mm256_setzero_si256();
    __m256i rows[kCellRows];
    for (int y = 0; y < cell.height; ++y, to += cell.width) {
      const T* row = row_of<T>(cell, f, y);
      __m256i sum = _mm256_setzero_si256();  // eight vectors of kNarrow fit 16 bits
      const auto add = [&](int x, __m256i d) {
        store(to + x, d);  // what is behind the row is overwritten by the next one
        sum = _mm256_add_epi16(sum, d);
        squares = _mm256_add_epi32(squares, _mm256_madd_epi16(d, d));
      };
      for (int x = 0; x < vectors; x += kLane) add(x, codes.take(row + x));
      if (rest > 0) add(vectors, codes.take_some(row + vectors, rest));
      rows[y] = _mm256_madd_epi16(sum, ones);
    }
    for (int y = cell.height; y % 8 != 0; ++y) rows[y] = _mm256_setzero_si256();
    store(to, _mm256_setzero_si256());
    store(to + kLane, _mm256_setzero_si256());
    store(sums.rows[f], sums_of_eight(rows));
    if (cell.height > 8) store(sums.rows[f] + 8, sums_of_eight(rows + 8));
    sums.squares[f] = sum_of_32(squares);
  }
  WholeRange range;
  codes.finish(range);
  return range;
}

/// Sixteen lanes of 16 bits as two times eight of 32.
struct Halves {
  __m256i first, second;
};
inline Halves halves(__m256i v) {
  return {_mm256_cvtepi16_epi32(_mm256_castsi256_si128(v)),
          _mm256_cvtepi16_epi32(_mm256_extracti128_si256(v, 1))};
}
/// The opposite, where the lanes fit.
inline __m256i joined(Halves h) {
  return _mm256_permute4x64_epi64(_mm256_packs_epi32(h.first, h.second), 0xD8);
}

inline const std::int16_t* frame_of(const WholeWorkspace& work, int f) {
  return work.centred[static_cast<std::size_t>(f)].data();
}

/// No centred pixel exceeds kNarrow: totals fit 16 bits, and products run for at least eight vectors in 32.
template <int kFrames>
void across_narrow(
    const CellInput& cell, const int* mean, int magnitude, WholeWorkspace& work, WholeAcross& out) {
  const int pixels = cell.width * cell.height;
  const int vectors = pixels / kLane * kLane;
  const double product = magnitude < 1 ? 1.0 : static_cast<double>(kFrames) * magnitude * magnitude;
  const double longest = 2147483647.0 / (2 * product);
  const int run = (longest < 64 ? static_cast<int>(longest) : 64) * kLane;
  const __m256i share = _mm256_set1_epi16(static_cast<std::int16_t>(narrow_share(kFrames)));
  __m256i means[kFrames];
  int sum_of_means = 0;
  for (int f = 0; f < kFrames; ++f) {
    means[f] = _mm256_set1_epi16(static_cast<std::int16_t>(mean[f]));
    sum_of_means += mean[f];
    out.with_total[f] = 0;
  }
  __m256i widest = _mm256_set1_epi16(-32768);
  __m256i sum[kFrames];
  const auto look = [&](int p, auto masked) {
    __m256i total = load(frame_of(work, 0) + p);
    __m256i high = _mm256_sub_epi16(total, means[0]);
    for (int f = 1; f < kFrames; ++f) {
      const __m256i d = load(frame_of(work, f) + p);
      total = _mm256_add_epi16(total, d);
      high = _mm256_max_epi16(high, _mm256_sub_epi16(d, means[f]));
    }
    const __m256i above = _mm256_sub_epi16(high, _mm256_mulhrs_epi16(total, share));
    if constexpr (masked)
      widest = _mm256_max_epi16(
          widest, _mm256_blendv_epi8(_mm256_set1_epi16(-32768), above, first_16(pixels - vectors)));
    else
      widest = _mm256_max_epi16(widest, above);
    const Halves wide = halves(total);
    store(work.total.data() + p, wide.first);
    store(work.total.data() + p + 8, wide.second);
    for (int f = 0; f < kFrames; ++f)
      sum[f] = _mm256_add_epi32(sum[f], _mm256_madd_epi16(total, load(frame_of(work, f) + p)));
  };
  for (int begin = 0; begin < pixels; begin += run) {
    const int end = begin + run < vectors ? begin + run : vectors;
    for (__m256i& s : sum) s = _mm256_setzero_si256();
    for (int p = begin; p < end; p += kLane) look(p, std::false_type{});
    if (begin + run >= pixels && vectors < pixels) look(vectors, std::true_type{});
    for (int f = 0; f < kFrames; ++f) out.with_total[f] += sum_of_32(sum[f]);
  }
  std::int16_t lanes[kLane];
  store(lanes, widest);
  int most = lanes[0];
  for (const std::int16_t lane : lanes) most = lane > most ? lane : most;
  out.above_mean = narrow_above(most, sum_of_means, kFrames);
}

/// Any magnitude: totals have 19 bits, and are multiplied in two parts.
template <int kFrames>
void across_any(const CellInput& cell, const int* mean, WholeWorkspace& work, WholeAcross& out) {
  const int pixels = cell.width * cell.height;
  constexpr int kRun = 16 * kLane;  // products with the upper part fit 27 bits
  __m256i means[kFrames];
  int sum_of_means = 0;
  for (int f = 0; f < kFrames; ++f) {
    means[f] = _mm256_set1_epi32(mean[f]);
    sum_of_means += mean[f];
    out.with_total[f] = 0;
  }
  const __m256i low_bits = _mm256_set1_epi32(255);
  const __m256i frames = _mm256_set1_epi32(kFrames);
  __m256i widest = _mm256_set1_epi32(-0x7fffffff);
  for (int begin = 0; begin < pixels; begin += kRun) {
    __m256i upper[kFrames];
    __m256i lower[kFrames];
    for (int f = 0; f < kFrames; ++f) upper[f] = lower[f] = _mm256_setzero_si256();
    for (int p = begin; p < pixels && p < begin + kRun; p += kLane) {
      Halves total = halves(load(frame_of(work, 0) + p));
      Halves high{_mm256_sub_epi32(total.first, means[0]), _mm256_sub_epi32(total.second, means[0])};
      for (int f = 1; f < kFrames; ++f) {
        const Halves d = halves(load(frame_of(work, f) + p));
        total = {_mm256_add_epi32(total.first, d.first), _mm256_add_epi32(total.second, d.second)};
        high = {_mm256_max_epi32(high.first, _mm256_sub_epi32(d.first, means[f])),
                _mm256_max_epi32(high.second, _mm256_sub_epi32(d.second, means[f]))};
      }
      store(work.total.data() + p, total.first);
      store(work.total.data() + p + 8, total.second);
      const __m256i none = _mm256_set1_epi32(-0x7fffffff);
      const __m256i first = _mm256_sub_epi32(_mm256_mullo_epi32(high.first, frames), total.first);
      const __m256i second = _mm256_sub_epi32(_mm256_mullo_epi32(high.second, frames), total.second);
      widest = _mm256_max_epi32(widest, _mm256_blendv_epi8(none, first, first_32(pixels - p)));
      widest = _mm256_max_epi32(widest, _mm256_blendv_epi8(none, second, first_32(pixels - p - 8)));
      const __m256i top = joined({_mm256_srai_epi32(total.first, 8), _mm256_srai_epi32(total.second, 8)});
      const __m256i rest =
          joined({_mm256_and_si256(total.first, low_bits), _mm256_and_si256(total.second, low_bits)});
      for (int f = 0; f < kFrames; ++f) {
        const __m256i d = load(frame_of(work, f) + p);
        upper[f] = _mm256_add_epi32(upper[f], _mm256_madd_epi16(d, top));
        lower[f] = _mm256_add_epi32(lower[f], _mm256_madd_epi16(d, rest));
      }
    }
    for (int f = 0; f < kFrames; ++f) out.with_total[f] += 256 * sum_of_32(upper[f]) + sum_of_32(lower[f]);
  }
  std::int32_t lanes[8];
  store(lanes, widest);
  int most = lanes[0];
  for (const std::int32_t lane : lanes) most = lane > most ? lane : most;
  out.above_mean = static_cast<double>(most + sum_of_means) / kFrames + kHiddenWide;
}

template <int kFrames>
void across_frames(
    const CellInput& cell, const int* mean, int magnitude, WholeWorkspace& work, WholeAcross& out) {
  if (magnitude <= kNarrow)
    across_narrow<kFrames>(cell, mean, magnitude, work, out);
  else
    across_any<kFrames>(cell, mean, work, out);
}

inline void whole_across(
    const CellInput& cell, const int* mean, int magnitude, WholeWorkspace& work, WholeAcross& out) {
  static_assert(kGroupFrames == 8);
  switch (cell.frames) {
    case 1:
      return across_frames<1>(cell, mean, magnitude, work, out);
    case 2:
      return across_frames<2>(cell, mean, magnitude, work, out);
    case 3:
      return across_frames<3>(cell, mean, magnitude, work, out);
    case 4:
      return across_frames<4>(cell, mean, magnitude, work, out);
    case 5:
      return across_frames<5>(cell, mean, magnitude, work, out);
    case 6:
      return across_frames<6>(cell, mean, magnitude, work, out);
    case 7:
      return across_frames<7>(cell, mean, magnitude, work, out);
    default:
      return across_frames<8>(cell, mean, magnitude, work, out);
  }
}

inline std::int64_t whole_count(const CellInput& cell, const WholeWorkspace& work, std::int16_t code) {
  const int pixels = cell.width * cell.height;
  const int vectors = pixels / kLane * kLane;
  const __m256i codes = _mm256_set1_epi16(code);
  __m256i count = _mm256_setzero_si256();  // a lane counts at most 512
  std::int64_t total = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < vectors; p += kLane)
      count = _mm256_sub_epi16(count, _mm256_cmpeq_epi16(load(d + p), codes));
    for (int p = vectors; p < pixels; ++p) total += d[p] == code ? 1 : 0;
  }
  return total + sum_of_32(_mm256_madd_epi16(count, _mm256_set1_epi16(1)));
}

inline std::int64_t whole_square(const std::int32_t* total, int count) {
  __m256i even = _mm256_setzero_si256();
  __m256i odd = _mm256_setzero_si256();
  const int vectors = count / 8 * 8;
  for (int p = 0; p < vectors; p += 8) {
    const __m256i v = load(total + p);
    const __m256i upper = _mm256_srli_epi64(v, 32);
    even = _mm256_add_epi64(even, _mm256_mul_epi32(v, v));
    odd = _mm256_add_epi64(odd, _mm256_mul_epi32(upper, upper));
  }
  std::int64_t part[4];
  store(part, _mm256_add_epi64(even, odd));
  std::int64_t sum = part[0] + part[1] + part[2] + part[3];
  for (int p = vectors; p < count; ++p) sum += static_cast<std::int64_t>(total[p]) * total[p];
  return sum;
}

inline void whole_lags(const WholeWorkspace& work,
                       int pixels,
                       int width,
                       std::int64_t (&sums)[kNeighbours + 1]) {
  const std::int16_t* d = work.difference.data();
  const int apart[kNeighbours + 1] = {0, 1, width, width + 1, width - 1};
  __m256i sum[kNeighbours + 1];
  for (__m256i& s : sum) s = _mm256_setzero_si256();
  for (int p = 0; p < pixels; p += kLane) {
    const __m256i v = load(d + p);
    for (int k = 0; k <= kNeighbours; ++k)
      sum[k] = _mm256_add_epi32(sum[k], _mm256_madd_epi16(v, load(d + p + apart[k])));
  }
  for (int k = 0; k <= kNeighbours; ++k) sums[k] = sum_of_32(sum[k]);
}

}  // namespace
