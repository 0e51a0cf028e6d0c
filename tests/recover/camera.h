#pragma once
/// A simulated camera measured in memory: scene in, characterization and truth out, the whole way of the
/// program but for its file formats.

#include <algorithm>
#include <cmath>
#include <functional>
#include <numeric>
#include <optional>
#include <string>
#include <vector>

#include "accumulate/accumulate.h"
#include "accumulate/raw_frames.h"
#include "analyse/analyse.h"
#include "analyse/dark_match.h"
#include "simulate/expose.h"
#include "simulate/truth.h"

namespace evenfield::test {

inline void add_series(Scene& scene, SeriesKind kind, double exposure_s, int frames, double light = 1.0) {
  SceneSeries series;
  series.conditions.kind = kind;
  series.conditions.exposure_s = exposure_s;
  series.conditions.light = kind == SeriesKind::flat ? light : 0.0;
  series.frames = frames;
  scene.series.push_back(series);
}

struct Measurement {
  Characterization result;
  std::vector<RegionTruth> truth;
};

/// What a camera does to its codes before it hands them out: to each by itself, and to a whole frame.
using CodeChange = std::function<std::uint16_t(Conditions, std::uint16_t)>;
using FrameChange = std::function<std::vector<std::uint16_t>(const std::vector<std::uint16_t>&, int width)>;

inline Measurement measure_scene(const Scene& scene,
                                 int threads = 2,
                                 const CodeChange& change = {},
                                 const FrameChange& change_frame = {}) {
  const Sensor sensor = realize(scene);
  AnalysisInput input;
  input.bit_depth = scene.camera.bit_depth;
  std::vector<Rect> rects;
  Measurement out;
  out.truth = region_truths(sensor);
  for (const RegionTruth& truth : out.truth) {
    input.regions.push_back({truth.name, truth.rect});
    rects.push_back(truth.rect);
  }
  const Geometry geometry = make_geometry({scene.width, scene.height, PixelType::u16}, rects);
  input.series.resize(scene.series.size());
  for (std::size_t s = 0; s < scene.series.size(); ++s)
    input.series[s].conditions = scene.series[s].conditions;
  for (const bool flats : {false, true})
    for (std::size_t s = 0; s < scene.series.size(); ++s) {
      const Conditions& conditions = scene.series[s].conditions;
      if ((conditions.kind == SeriesKind::flat) != flats) continue;
      std::vector<std::vector<std::uint16_t>> frames;
      for (int f = 0; f < scene.series[s].frames; ++f) {
        frames.push_back(expose(sensor, static_cast<int>(s), f));
        if (change)
          for (std::uint16_t& code : frames.back()) code = change(conditions, code);
        if (change_frame) frames.back() = change_frame(frames.back(), scene.width);
      }
      const RawFrames<std::uint16_t> raw(scene.width, scene.height, std::move(frames));
      AccumulateOptions options;
      options.threads = threads;
      if (!flats) options.fewest_frames_for_hits = 3;
      auto sums = accumulate(raw.stack(), geometry, options);
      for (std::size_t r = 0; r < rects.size(); ++r) {
        std::optional<double> dark;
        if (flats) {
          const SeriesWeights weights = match_dark(input, r, conditions).mean;
          dark = std::accumulate(weights.begin(), weights.end(), 0.0, [&](double sum, const auto& d) {
            return sum + d.second * input.series[d.first].regions[r].mean;
          });
        }
        input.series[s].regions.push_back(summarize(sums->regions[r], dark));
      }
      input.series[s].fingerprints = sums->fingerprints;
      input.series[s].code_sample = sums->code_sample;
    }
  out.result = analyse(input);
  return out;
}

const Quantity& quantity(Characterization&&,
                         const std::string&,
                         const std::string& = {}) = delete;  // it would dangle
inline const Quantity& quantity(const Characterization& result,
                                const std::string& name,
                                const std::string& region = "whole") {
  static const Quantity kNone{};
  const auto found = std::find_if(result.quantities.begin(), result.quantities.end(),
                                  [&](const Quantity& q) { return q.name == name && q.region == region; });
  return found == result.quantities.end() ? kNone : *found;
}

/// (value - truth) / standard uncertainty, over many cameras.
struct Pulls {
  std::vector<double> values;
  int inside = 0;   ///< 95 % intervals that held the truth
  int missing = 0;  ///< without a value

  void add(const Quantity& q, double truth) {
    if (!q.value || !q.standard_uncertainty || !(*q.standard_uncertainty > 0)) {
      ++missing;
      return;
    }
    values.push_back((*q.value - truth) / *q.standard_uncertainty);
    if (*q.low95 <= truth && truth <= *q.high95) ++inside;
  }
  double mean() const {
    return std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
  }
  double spread() const {
    double squares = 0;
    for (const double v : values) squares += (v - mean()) * (v - mean());
    return std::sqrt(squares / static_cast<double>(values.size() - 1));
  }
};

}  // namespace evenfield::test
