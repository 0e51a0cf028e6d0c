#pragma once
// Hits: which samples of a cell are set aside, and what replaces them. Part of cell_kernel_loops.h; see
// there.
#include "accumulate/cell_workspace.h"

namespace {

/// Temporal sum of squares of the cell, each frame's mean taken out; its degrees of freedom are (pixels -
/// 1)(frames - 1).
inline double temporal_squares(const CellInput& cell, const CellStatistics& s) {
  const double n = cell.width * cell.height;
  double own = 0;
  double all = 0;
  double sum = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const auto k = static_cast<std::size_t>(f);
    own += s.squares[k] - s.sums[k] * s.sums[k] / n;
    all += s.with_total[k];
    sum += s.sums[k];
  }
  const double squares = own - (all - sum * sum / n) / cell.frames;
  return squares > 0 ? squares : 0;
}

/// Limit for frames x (highest deviation) - (sum of deviations), which is (frames - 1) times the distance of
/// the highest frame from the mean of the others. Two codes more for whole numbers: coarse steps are no hits.
inline double hit_limit(const CellInput& cell, bool whole_codes, double variance) {
  return cell.hit_threshold * std::sqrt(variance > 0 ? variance * cell.frames * (cell.frames - 1.0) : 0.0) +
         (whole_codes ? 2.0 * (cell.frames - 1.0) : 0.0);
}

/// So many pixels of a cell may be hits; more are a structure that one variance does not describe.
inline int most_hits(int pixels) { return pixels / 32 > 4 ? pixels / 32 : 4; }

/// The `rank`-th largest of `count` values (from 0), which are reordered.
inline double select_largest(double* values, int count, int rank) {
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

/// Temporal variance of the cell without the pixels of largest squares (which are left in work.squares), as
/// many as may be hits: never a variance that contains what is judged by it. Leaving out the largest of clean
/// pixels makes it smaller, by a quarter at most for two frames.
template <class C>
double trimmed_variance(const CellInput& cell, Workspace<C>& work, const CellStatistics& s) {
  const int pixels = cell.width * cell.height;
  const int left_out = most_hits(pixels);
  double* squares = work.squares.data();
  double* sums = work.scratch.data();
  constexpr int kChunk = 256;  // stays in the nearest cache while the frames pass over it
  for (int begin = 0; begin < pixels; begin += kChunk) {
    const int end = begin + kChunk < pixels ? begin + kChunk : pixels;
    for (int p = begin; p < end; ++p) squares[p] = sums[p] = 0;
    for (int f = 0; f < cell.frames; ++f) {
      const auto* d = work.centred[static_cast<std::size_t>(f)].data();
      const double mean = s.sums[static_cast<std::size_t>(f)] / pixels;
      for (int p = begin; p < end; ++p) {
        const double e = static_cast<double>(d[p]) - mean;
        squares[p] += e * e;
        sums[p] += e;
      }
    }
    for (int p = begin; p < end; ++p) squares[p] -= sums[p] * sums[p] / cell.frames;
  }
  double* ordered = work.scratch.data();
  for (int p = 0; p < pixels; ++p) ordered[p] = squares[p];
  select_largest(ordered, pixels, left_out);
  double part[8] = {0, 0, 0, 0, 0, 0, 0, 0};  // in a fixed order; one running sum would wait for itself
  for (int p = left_out; p < pixels; ++p) part[p & 7] += ordered[p];
  const double kept =
      ((part[0] + part[1]) + (part[2] + part[3])) + ((part[4] + part[5]) + (part[6] + part[7]));
  return kept / ((pixels - left_out) * (cell.frames - 1.0));
}

/// One pixel of the cell through the frames of the group, each frame's mean taken out.
struct PixelSeries {
  double deviation[kGroupFrames];
  int highest = 0;
  double others_mean = 0;  ///< of all frames but the highest
  double others_range = 0;
};

template <class C>
PixelSeries pixel_series(const CellInput& cell, const Workspace<C>& work, const CellStatistics& s, int p) {
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

/// How many samples of the cell show its highest code.
template <class C>
int samples_at_highest(const CellInput& cell, const Workspace<C>& work) {
  const int pixels = cell.width * cell.height;
  C highest = work.centred[0][0];
  for (int f = 0; f < cell.frames; ++f) {
    const C* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p) highest = d[p] > highest ? d[p] : highest;
  }
  int count = 0;
  for (int f = 0; f < cell.frames; ++f) {
    const C* d = work.centred[static_cast<std::size_t>(f)].data();
    for (int p = 0; p < pixels; ++p) count += d[p] == highest ? 1 : 0;
  }
  return count;
}

/// Sums of a frame after one of its pixels has changed: exact for whole numbers.
inline void put_right(
    const CellInput& cell, int frame, int pixel, double before, double after, CellStatistics& out) {
  const auto f = static_cast<std::size_t>(frame);
  out.sums[f] += after - before;
  out.squares[f] += after * after - before * before;
  out.row_sums[f * kCellRows + static_cast<std::size_t>(pixel / cell.width)] += after - before;
}

/// Replaces hits and puts the sums of their frames right; returns how many. A hit is a pixel whose highest
/// frame stands above the mean of its other frames by more than the threshold, while those others agree among
/// themselves: a pixel that blinks, or a hot one with noise of its own, is not a hit. Hits shift the frame
/// means that all is judged by, so the caller asks again until there are none.
template <class C>
int replace_hits(const CellInput& cell, bool whole_codes, Workspace<C>& work, CellStatistics& out) {
  const int pixels = cell.width * cell.height;
  const double frames = cell.frames;
  const int most = most_hits(pixels);
  if (pixels <= 2 * most) return 0;
  const double limit = hit_limit(cell, whole_codes, trimmed_variance(cell, work, out));
  // A frame at the distance d from the mean of the others adds d^2 (frames - 1) / frames to the squares of
  // its pixel.
  const double least_squares = 0.999 * limit * limit / (frames * (frames - 1));
  // Noise that is cut off at the top code looks like hits of pixels that seldom reach it.
  if (samples_at_highest(cell, work) > most_hits(pixels) * cell.frames / 4) return 0;
  int found = 0;
  int hit_pixel[kCellPixels / 32 + 4];
  int hit_frame[kCellPixels / 32 + 4];
  for (int p = 0; p < pixels; ++p) {
    if (work.squares[static_cast<std::size_t>(p)] < least_squares) continue;
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
    auto& stored =
        work.centred[static_cast<std::size_t>(hit_frame[i])][static_cast<std::size_t>(hit_pixel[i])];
    const auto before = static_cast<double>(stored);
    if constexpr (std::is_same_v<C, std::int16_t>) {
      const double whole = std::floor(value + 0.5);
      stored = static_cast<std::int16_t>(whole < -32768 ? -32768 : whole > 32767 ? 32767 : whole);
    } else {
      stored = whole_codes ? std::floor(value + out.centre + 0.5) - out.centre : value;
    }
    ++out.hits[static_cast<std::size_t>(hit_frame[i])];
    put_right(cell, hit_frame[i], hit_pixel[i], before, static_cast<double>(stored), out);
  }
  return found;
}

}  // namespace
