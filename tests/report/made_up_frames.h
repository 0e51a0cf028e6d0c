#pragma once
/// Made-up mean frames, darks and signal-to-noise ratios for pictures; values are plausible, none is
/// measured.

#include <algorithm>
#include <cmath>
#include <random>

#include "result/characterization.h"

namespace evenfield {

struct MadeUpFrame {
  int columns = 320, rows = 200;
  double mean_dn = 100;
  double spread_dn = 0.6;  ///< of single pixels
  double falloff = 0;      ///< share of the mean lost in the corners
  double hot_dn = 0;       ///< of one pixel in five hundred, on top
  int bins = 256;
  double ripple_dn = 0;  ///< of a pattern that repeats after four columns
};

inline Spectrogram made_up_spectrogram(int length,
                                       int lines,
                                       const MadeUpFrame& shape,
                                       std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  Spectrogram out;
  out.length = length;
  out.lines = lines;
  out.white_dn = shape.spread_dn;
  out.temporal_dn = 0.3 * shape.spread_dn;
  for (int v = 0; v <= length / 2; ++v) {
    const double slow = shape.falloff * shape.mean_dn * std::sqrt(length) / (1.0 + v * v);
    const double peak = v == length / 4 ? shape.ripple_dn * std::sqrt(length) / 2 : 0;
    out.amplitude_dn.push_back(std::hypot(
        shape.spread_dn * std::sqrt(std::max(0.0, 1 + normal(random) / std::sqrt(lines))), slow + peak));
  }
  out.non_whiteness = 1.3;
  return out;
}

inline MeanFrame made_up_frame(const MadeUpFrame& shape, std::uint64_t seed = 11) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> normal;
  MeanFrame out;
  out.frames = 16;
  out.mean_dn = shape.mean_dn;
  out.normal_dn = shape.spread_dn;
  const auto lines = [&](int points, int other, Profiles& profiles) {
    for (int i = 0; i < points; ++i) {
      const double place = points > 1 ? 2.0 * i / (points - 1) - 1 : 0;
      const double level =
          shape.mean_dn * (1 + shape.falloff * (0.3 - place * place)) + (i % 4 == 0 ? shape.ripple_dn : 0);
      const double reach = shape.spread_dn * std::sqrt(2 * std::log(other + 1.0));
      profiles.middle.push_back(level + shape.spread_dn * normal(random));
      profiles.mean.push_back(level + shape.spread_dn / std::sqrt(other) * normal(random));
      profiles.lowest.push_back(level - reach * (1 + 0.1 * normal(random)));
      profiles.highest.push_back(level + reach * (1 + 0.1 * normal(random)) +
                                 (i % 5 == 0 ? shape.hot_dn : 0));
    }
  };
  lines(shape.columns, shape.rows, out.along_row);
  lines(shape.rows, shape.columns, out.along_column);
  out.of_rows = made_up_spectrogram(shape.columns, shape.rows, shape, random);
  out.of_columns = made_up_spectrogram(shape.rows, shape.columns, shape, random);

  const double reach = 5 * shape.spread_dn + shape.falloff * shape.mean_dn;
  const double low = shape.mean_dn - reach, high = shape.mean_dn + reach + shape.hot_dn;
  const double width = (high - low) / std::max(1, shape.bins - 1);
  out.values = {low, width, std::vector<std::int64_t>(static_cast<std::size_t>(shape.bins))};
  out.deviations = {0, width, std::vector<std::int64_t>(static_cast<std::size_t>(shape.bins))};
  const int pixels = shape.columns * shape.rows;
  const auto place = [&](double steps) {
    return static_cast<std::size_t>(std::clamp(std::isfinite(steps) ? steps : 0.0, 0.0, shape.bins - 1.0));
  };
  for (int i = 0; i < pixels; ++i) {
    const double value = shape.mean_dn + shape.spread_dn * normal(random) + (i % 500 == 7 ? shape.hot_dn : 0);
    ++out.values.counts[place(std::round((value - low) / width))];
    ++out.deviations.counts[place(std::abs(value - shape.mean_dn) / width)];
  }
  for (std::size_t i = out.deviations.counts.size(); i-- > 1;)
    out.deviations.counts[i - 1] += out.deviations.counts[i];
  return out;
}

/// Every curve that made_up_curves() leaves out, on a scale of `unit` DN or electrons.
inline void add_made_up_frames(RegionCurves& curves, double unit = 1, int columns = 320, int rows = 200) {
  MadeUpFrame dark, flat;
  dark.columns = flat.columns = columns;
  dark.rows = flat.rows = rows;
  dark.mean_dn = 100 * unit;
  dark.spread_dn = 0.6 * unit;
  dark.hot_dn = 40 * unit;
  dark.ripple_dn = 0.5 * unit;
  flat.mean_dn = 2000 * unit;
  flat.spread_dn = 9 * unit;
  flat.falloff = 0.04;
  curves.dark_frame = made_up_frame(dark);
  curves.flat_frame = made_up_frame(flat, 12);
  for (const double exposure : {0.0, 0.01, 1.0, 5.0, 10.0, 20.0})
    curves.dark_mean.push_back({exposure, unit * (100 + 0.05 * exposure + 0.004 * std::sin(7 * exposure)),
                                0.006 * unit, unit * (100 + 0.05 * exposure), exposure > 0});
  SnrCurve snr;
  snr.dark_noise_e = 2.5 * std::sqrt(unit);
  snr.dsnu_e = 1.3 * std::sqrt(unit);
  snr.prnu = 0.005;
  snr.saturation_e = 8000 * unit;
  for (int i = 0; i < 14; ++i) {
    const double signal = unit * 7900 * std::pow(0.5, i);
    const double ratio = signal / std::sqrt(signal + snr.dark_noise_e * snr.dark_noise_e);
    snr.points.push_back({signal, ratio * (1 + 0.01 * std::sin(3.0 * i)), ratio * 0.01});
  }
  curves.snr = snr;
}

}  // namespace evenfield
