#pragma once
// Loops over integers of up to 16 bits, sixteen at a time. Part of cell_kernel_loops.h; see there. The same
// functions as in cell_whole_portable.h, where they are described.
#include <immintrin.h>

#include "accumulate/cell_workspace.h"

namespace {

inline constexpr int kLane = 16;

inline __m256i load(const std::int16_t* p) { return _mm256_load_si256(reinterpret_cast<const __m256i*>(p)); }

/// Sixteen pixels as 16 bit numbers; unsigned ones of 16 bits keep their bits.
template <class T>
__m256i widened(const T* p) {
  if constexpr (sizeof(T) == 2) {
    return _mm256_loadu_si256(reinterpret_cast<const __m256i*>(p));
  } else {
    const __m128i bytes = _mm_loadu_si128(reinterpret_cast<const __m128i*>(p));
    return std::is_signed_v<T> ? _mm256_cvtepi8_epi16(bytes) : _mm256_cvtepu8_epi16(bytes);
  }
}

template <class T>
constexpr bool kUnsigned16 = std::is_same_v<T, std::uint16_t>;

inline std::int64_t sum_of_32(__m256i v) {
  const __m256i wide = _mm256_add_epi64(_mm256_cvtepi32_epi64(_mm256_castsi256_si128(v)),
                                        _mm256_cvtepi32_epi64(_mm256_extracti128_si256(v, 1)));
  alignas(32) std::int64_t part[4];
  _mm256_store_si256(reinterpret_cast<__m256i*>(part), wide);
  return part[0] + part[1] + part[2] + part[3];
}

template <class T>
Range<T> whole_gather(const CellInput& cell, Workspace<std::int16_t>& work) {
  Range<T> range{*row_of<T>(cell, 0, 0), *row_of<T>(cell, 0, 0)};
  const int vectors = cell.width / kLane * kLane;
  __m256i low = _mm256_set1_epi16(static_cast<std::int16_t>(range.low));
  __m256i high = low;
  for (int f = 0; f < cell.frames; ++f) {
    std::int16_t* to = work.centred[static_cast<std::size_t>(f)].data();
    for (int y = 0; y < cell.height; ++y, to += cell.width) {
      const T* row = row_of<T>(cell, f, y);
      for (int x = 0; x < vectors; x += kLane) {
        const __m256i v = widened(row + x);
        low = kUnsigned16<T> ? _mm256_min_epu16(low, v) : _mm256_min_epi16(low, v);
        high = kUnsigned16<T> ? _mm256_max_epu16(high, v) : _mm256_max_epi16(high, v);
        _mm256_storeu_si256(reinterpret_cast<__m256i*>(to + x), v);
      }
      for (int x = vectors; x < cell.width; ++x) {
        range.low = row[x] < range.low ? row[x] : range.low;
        range.high = row[x] > range.high ? row[x] : range.high;
        to[x] = static_cast<std::int16_t>(row[x]);
      }
    }
  }
  using Wide = std::conditional_t<kUnsigned16<T>, std::uint16_t, std::int16_t>;
  alignas(32) Wide lows[kLane];
  alignas(32) Wide highs[kLane];
  _mm256_store_si256(reinterpret_cast<__m256i*>(lows), low);
  _mm256_store_si256(reinterpret_cast<__m256i*>(highs), high);
  for (int i = 0; i < kLane; ++i) {
    range.low = static_cast<T>(lows[i]) < range.low ? static_cast<T>(lows[i]) : range.low;
    range.high = static_cast<T>(highs[i]) > range.high ? static_cast<T>(highs[i]) : range.high;
  }
  return range;
}

inline void whole_centre(int frames, int pixels, int centre, Workspace<std::int16_t>& work) {
  const __m256i shifts = _mm256_set1_epi16(static_cast<std::int16_t>(centre));
  for (int f = 0; f < frames; ++f) {
    std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < padded(pixels); p += kLane)
      _mm256_store_si256(reinterpret_cast<__m256i*>(d + p), _mm256_sub_epi16(load(d + p), shifts));
    for (int p = pixels; p < padded(pixels); ++p) d[p] = 0;
  }
}

inline std::int64_t whole_count(const Workspace<std::int16_t>& work,
                                int frames,
                                int pixels,
                                std::int16_t code) {
  const __m256i codes = _mm256_set1_epi16(code);
  const int vectors = pixels / kLane * kLane;
  std::int64_t total = 0;
  for (int f = 0; f < frames; ++f) {
    const std::int16_t* d = work.centred[static_cast<std::size_t>(f)].data();
    __m256i count = _mm256_setzero_si256();  // a lane counts at most 128
    for (int p = 0; p < vectors; p += kLane)
      count = _mm256_sub_epi16(count, _mm256_cmpeq_epi16(load(d + p), codes));
    total += sum_of_32(_mm256_madd_epi16(count, _mm256_set1_epi16(1)));
    for (int p = vectors; p < pixels; ++p) total += d[p] == code ? 1 : 0;
  }
  return total;
}

/// A row of whole vectors, summed into eight lanes of 32 bits. `narrow`: eight vectors fit 16 bit lanes.
inline __m256i row_lanes(const std::int16_t* row, int width, bool narrow) {
  const __m256i ones = _mm256_set1_epi16(1);
  const auto vector = [row](int x) { return _mm256_loadu_si256(reinterpret_cast<const __m256i*>(row + x)); };
  if (narrow) {
    __m256i sum = vector(0);
    for (int x = kLane; x < width; x += kLane) sum = _mm256_add_epi16(sum, vector(x));
    return _mm256_madd_epi16(sum, ones);
  }
  __m256i sum = _mm256_madd_epi16(vector(0), ones);
  for (int x = kLane; x < width; x += kLane) sum = _mm256_add_epi32(sum, _mm256_madd_epi16(vector(x), ones));
  return sum;
}

inline void whole_row_sums(
    const std::int16_t* d, int width, int height, double magnitude, std::int32_t* sums) {
  int y = 0;
  if (width % kLane == 0) {
    const bool narrow = magnitude * (width / kLane) <= 32767;
    constexpr int kTogether = 8;  // eight rows end in the eight lanes of one vector
    for (; y + kTogether <= height; y += kTogether, d += kTogether * width) {
      __m256i lanes[kTogether];
      for (int k = 0; k < kTogether; ++k) lanes[k] = row_lanes(d + k * width, width, narrow);
      const __m256i first =
          _mm256_hadd_epi32(_mm256_hadd_epi32(lanes[0], lanes[1]), _mm256_hadd_epi32(lanes[2], lanes[3]));
      const __m256i last =
          _mm256_hadd_epi32(_mm256_hadd_epi32(lanes[4], lanes[5]), _mm256_hadd_epi32(lanes[6], lanes[7]));
      const __m256i lower = _mm256_permute2x128_si256(first, last, 0x20);
      const __m256i upper = _mm256_permute2x128_si256(first, last, 0x31);
      _mm256_storeu_si256(reinterpret_cast<__m256i*>(sums + y), _mm256_add_epi32(lower, upper));
    }
  }
  for (; y < height; ++y, d += width) {
    std::int32_t total = 0;
    for (int x = 0; x < width; ++x) total += d[x];
    sums[y] = total;
  }
}

/// Frames [i, i + kRows) against frames [j, j + kColumns): each product of a block of pairs has a register of
/// its own.
template <int kRows, int kColumns>
void gram_block(const Workspace<std::int16_t>& work,
                int i,
                int j,
                int pixels,
                int run,
                std::int64_t (&out)[kRows][kColumns]) {
  for (auto& row : out)
    for (std::int64_t& value : row) value = 0;
  for (int begin = 0; begin < pixels; begin += run) {
    const int end = begin + run < pixels ? begin + run : pixels;
    __m256i sum[kRows][kColumns];
    for (auto& row : sum)
      for (__m256i& value : row) value = _mm256_setzero_si256();
    for (int p = begin; p < end; p += kLane) {
      __m256i b[kColumns];
      for (int c = 0; c < kColumns; ++c)
        b[c] = load(work.centred[static_cast<std::size_t>(j + c)].data() + p);
      for (int r = 0; r < kRows; ++r) {
        const __m256i a = load(work.centred[static_cast<std::size_t>(i + r)].data() + p);
        for (int c = 0; c < kColumns; ++c)
          sum[r][c] = _mm256_add_epi32(sum[r][c], _mm256_madd_epi16(a, b[c]));
      }
    }
    for (int r = 0; r < kRows; ++r)
      for (int c = 0; c < kColumns; ++c) out[r][c] += sum_of_32(sum[r][c]);
  }
}

inline void whole_gram(
    const Workspace<std::int16_t>& work, int frames, int pixels, double magnitude, std::int64_t* gram) {
  // A lane of 32 bits takes two products a vector; magnitudes of 32768 would not fit even once.
  const int vectors = products_in_32_bits(magnitude) / 2;
  if (vectors < 1) {
    for (int i = 0; i < frames; ++i)
      for (int j = i; j < frames; ++j) {
        std::int64_t total = 0;
        for (int p = 0; p < pixels; ++p)
          total += std::int64_t{work.centred[static_cast<std::size_t>(i)][static_cast<std::size_t>(p)]} *
                   work.centred[static_cast<std::size_t>(j)][static_cast<std::size_t>(p)];
        gram[pair_index(i, j, frames)] = total;
      }
    return;
  }
  const int run =
      (vectors < static_cast<int>(kCellPixels) / kLane ? vectors : static_cast<int>(kCellPixels) / kLane) *
      kLane;
  int i = 0;
  for (; i + 2 <= frames; i += 2) {
    int j = i;
    for (; j + 4 <= frames; j += 4) {
      std::int64_t block[2][4];
      gram_block(work, i, j, pixels, run, block);
      for (int r = 0; r < 2; ++r)
        for (int c = 0; c < 4; ++c)
          if (j + c >= i + r) gram[pair_index(i + r, j + c, frames)] = block[r][c];
    }
    for (; j < frames; ++j) {
      std::int64_t block[2][1];
      gram_block(work, i, j, pixels, run, block);
      for (int r = 0; r < 2; ++r)
        if (j >= i + r) gram[pair_index(i + r, j, frames)] = block[r][0];
    }
  }
  for (; i < frames; ++i)
    for (int j = i; j < frames; ++j) {
      std::int64_t block[1][1];
      gram_block(work, i, j, pixels, run, block);
      gram[pair_index(i, j, frames)] = block[0][0];
    }
}

inline int whole_deviation_range(const Workspace<std::int16_t>& work,
                                 int frames,
                                 int pixels,
                                 const int* mean) {
  const int vectors = pixels / kLane * kLane;
  __m256i means[kGroupFrames];
  for (int f = 0; f < frames; ++f) means[f] = _mm256_set1_epi16(static_cast<std::int16_t>(mean[f]));
  __m256i widest = _mm256_setzero_si256();
  for (int p = 0; p < vectors; p += kLane) {
    // Differences saturate at the ends of 16 bits, which is more than any limit that is asked about.
    __m256i low = _mm256_subs_epi16(load(work.centred[0].data() + p), means[0]);
    __m256i high = low;
    for (int f = 1; f < frames; ++f) {
      const __m256i e =
          _mm256_subs_epi16(load(work.centred[static_cast<std::size_t>(f)].data() + p), means[f]);
      low = _mm256_min_epi16(low, e);
      high = _mm256_max_epi16(high, e);
    }
    widest = _mm256_max_epi16(widest, _mm256_subs_epi16(high, low));
  }
  alignas(32) std::int16_t lanes[kLane];
  _mm256_store_si256(reinterpret_cast<__m256i*>(lanes), widest);
  int out = 0;
  for (const std::int16_t lane : lanes) out = lane > out ? lane : out;
  for (int p = vectors; p < pixels; ++p) {
    int low = work.centred[0][static_cast<std::size_t>(p)] - mean[0];
    int high = low;
    for (int f = 1; f < frames; ++f) {
      const int e = work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)] - mean[f];
      low = e < low ? e : low;
      high = e > high ? e : high;
    }
    out = high - low > out ? high - low : out;
  }
  return out;
}

inline void whole_add(const Workspace<std::int16_t>& work,
                      int frames,
                      int pixels,
                      double magnitude,
                      bool begin,
                      int shift,
                      std::int32_t* total) {
  const int vectors = pixels / kLane * kLane;
  const __m256i shifts = _mm256_set1_epi32(shift);
  const bool narrow = magnitude * frames <= 32767;  // the sum over frames fits 16 bits
  for (int p = 0; p < vectors; p += kLane) {
    __m256i low = shifts;
    __m256i high = shifts;
    if (narrow) {
      __m256i sum = load(work.centred[0].data() + p);
      for (int f = 1; f < frames; ++f)
        sum = _mm256_add_epi16(sum, load(work.centred[static_cast<std::size_t>(f)].data() + p));
      low = _mm256_add_epi32(low, _mm256_cvtepi16_epi32(_mm256_castsi256_si128(sum)));
      high = _mm256_add_epi32(high, _mm256_cvtepi16_epi32(_mm256_extracti128_si256(sum, 1)));
    } else {
      for (int f = 0; f < frames; ++f) {
        const __m256i d = load(work.centred[static_cast<std::size_t>(f)].data() + p);
        low = _mm256_add_epi32(low, _mm256_cvtepi16_epi32(_mm256_castsi256_si128(d)));
        high = _mm256_add_epi32(high, _mm256_cvtepi16_epi32(_mm256_extracti128_si256(d, 1)));
      }
    }
    auto* to = reinterpret_cast<__m256i*>(total + p);
    if (!begin) {
      low = _mm256_add_epi32(low, _mm256_loadu_si256(to));
      high = _mm256_add_epi32(high, _mm256_loadu_si256(to + 1));
    }
    _mm256_storeu_si256(to, low);
    _mm256_storeu_si256(to + 1, high);
  }
  for (int p = vectors; p < pixels; ++p) {
    std::int32_t sum = begin ? shift : total[p] + shift;
    for (int f = 0; f < frames; ++f)
      sum += work.centred[static_cast<std::size_t>(f)][static_cast<std::size_t>(p)];
    total[p] = sum;
  }
}

inline std::int64_t whole_square(const std::int32_t* total, int count) {
  __m256i even = _mm256_setzero_si256();
  __m256i odd = _mm256_setzero_si256();
  const int vectors = count / 8 * 8;
  for (int p = 0; p < vectors; p += 8) {
    const __m256i v = _mm256_loadu_si256(reinterpret_cast<const __m256i*>(total + p));
    const __m256i upper = _mm256_srli_epi64(v, 32);
    even = _mm256_add_epi64(even, _mm256_mul_epi32(v, v));
    odd = _mm256_add_epi64(odd, _mm256_mul_epi32(upper, upper));
  }
  alignas(32) std::int64_t part[4];
  _mm256_store_si256(reinterpret_cast<__m256i*>(part), _mm256_add_epi64(even, odd));
  std::int64_t sum = part[0] + part[1] + part[2] + part[3];
  for (int p = vectors; p < count; ++p) sum += static_cast<std::int64_t>(total[p]) * total[p];
  return sum;
}

}  // namespace
