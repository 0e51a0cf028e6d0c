/// Speed of the cell kernels on one band of eight frames that stays in cache: all cells of the band are
/// measured, then their totals squared, as accumulate does it; the fingerprint of the rows is timed apart.
/// Reported as bytes of pixels a second and CPU.
///   build/release/bin/bench_kernels --benchmark_filter='measure/u16'

#include <benchmark/benchmark.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>
#include <memory>
#include <random>
#include <string>
#include <vector>

#include "accumulate/cell_kernel.h"

namespace {

using evenfield::CellInput;
using evenfield::CellKernels;
using evenfield::CellSquares;
using evenfield::CellStatistics;
using evenfield::CellTotals;
using evenfield::PixelType;

constexpr int kColumns = 2048;
constexpr int kRows = static_cast<int>(evenfield::kCellPixels) / evenfield::kCellColumns;
constexpr int kCells = kColumns / evenfield::kCellColumns;
constexpr int kFrames = evenfield::kGroupFrames;
constexpr std::size_t kFramePixels = std::size_t{kRows} * kColumns;
constexpr double kHitThreshold = 9;  // as AccumulateOptions has it

/// One band, frame after frame.
template <class Pixel>
struct BandPixels {
  std::vector<Pixel> values = std::vector<Pixel>(kFramePixels * kFrames + evenfield::kReadBeyond);
  const Pixel* frame(int f) const { return values.data() + kFramePixels * static_cast<std::size_t>(f); }
};

/// Half of the type's range in 8 and 16 bits, 16-bit codes in the wider types; drift of 1 % in both kinds of
/// light. Uneven light falls to half across the band, and one pixel of the band is hit, which is a dozen or
/// so hits in 2048 x 2048 pixels and eight frames for every tenth band: more than a real frame has.
template <class Pixel>
BandPixels<Pixel> exposed(bool uneven, bool real = false) {
  const bool is_byte = sizeof(Pixel) == 1;
  const double offset = std::is_same_v<Pixel, std::int16_t> ? -32768 : 0;
  const double mean = is_byte ? 120 : 30000;
  const double noise = is_byte ? 2 : 120;
  std::mt19937 bits(20261124);
  std::normal_distribution<double> normal;
  BandPixels<Pixel> band;
  for (std::size_t i = 0; i < kFramePixels * kFrames; ++i) {
    const auto frame = static_cast<double>(i / kFramePixels);
    const auto column = static_cast<double>(i % kColumns);
    const double light = uneven ? 1 - 0.5 * column / kColumns : 1.0;
    const double drift = 1 + 0.01 * std::sin(frame);
    const double value = offset + mean * light * drift + noise * std::sqrt(light) * normal(bits);
    // Real numbers, as calibrated frames hold them, go another way than whole ones of the same type.
    band.values[i] = static_cast<Pixel>(real ? value : std::rint(value));
  }
  if (uneven) {
    const std::size_t hit = 3 * kFramePixels + 5 * kColumns + 1000;
    band.values[hit] = static_cast<Pixel>(band.values[hit] + 40 * noise);
  }
  return band;
}

template <class Pixel>
void set_bytes(benchmark::State& state) {
  state.SetBytesProcessed(static_cast<std::int64_t>(state.iterations()) *
                          static_cast<std::int64_t>(kFramePixels * kFrames * sizeof(Pixel)));
}

template <class Pixel>
void measure_band(benchmark::State& state, PixelType type, bool uneven, bool portable, bool real) {
  const BandPixels<Pixel> band = exposed<Pixel>(uneven, real);
  const CellKernels kernels = evenfield::cell_kernels(type, portable);
  const auto totals = std::make_unique<CellTotals>();
  std::vector<double> memory(kernels.workspace_bytes / sizeof(double) + 8);
  std::size_t room = memory.size() * sizeof(double);
  void* workspace = memory.data();
  std::align(64, kernels.workspace_bytes, workspace, room);
  CellStatistics statistics;
  CellSquares squares;
  CellInput input;
  input.stride = kColumns;
  input.frames = kFrames;
  input.width = evenfield::kCellColumns;
  input.height = kRows;
  input.hit_threshold = kHitThreshold;
  for (auto _ : state) {
    for (int c = 0; c < kCells; ++c) {
      for (int f = 0; f < kFrames; ++f) {
        input.pixels[static_cast<std::size_t>(f)] = band.frame(f) + c * evenfield::kCellColumns;
      }
      // A block is as wide as a cell here, and this band is its first: extremes are counted, the dearest
      // case.
      input.known_lowest = std::numeric_limits<double>::infinity();
      input.known_highest = -std::numeric_limits<double>::infinity();
      kernels.measure(input, *totals, workspace, statistics, squares);
      benchmark::DoNotOptimize(statistics);
      benchmark::DoNotOptimize(squares);
    }
  }
  if (statistics.bad_frame >= 0)
    state.SkipWithError("found a pixel that is not finite, expected finite pixels");
  set_bytes<Pixel>(state);
}

void hash_band(benchmark::State& state, bool portable) {
  const BandPixels<std::uint16_t> band = exposed<std::uint16_t>(false);
  const CellKernels kernels = evenfield::cell_kernels(PixelType::u16, portable);
  for (auto _ : state) {
    for (std::size_t row = 0; row < kFrames * kFramePixels / kColumns; ++row) {
      benchmark::DoNotOptimize(
          kernels.hash(band.values.data() + row * kColumns, kColumns * sizeof(std::uint16_t), row));
    }
  }
  set_bytes<std::uint16_t>(state);
}

template <class Pixel>
void add_type(const std::string& name, PixelType type, bool real = false) {
  for (const bool uneven : {false, true}) {
    for (const bool portable : {false, true}) {
      const std::string label = "measure/" + name + (uneven ? "/uneven_with_hits" : "/even") +
                                (portable ? "/portable" : "/special");
      benchmark::RegisterBenchmark(label.c_str(), measure_band<Pixel>, type, uneven, portable, real);
    }
  }
}

}  // namespace

int main(int argc, char** argv) {
  benchmark::Initialize(&argc, argv);
  if (benchmark::ReportUnrecognizedArguments(argc, argv)) return 2;
  add_type<std::uint8_t>("u8", PixelType::u8);
  add_type<std::uint16_t>("u16", PixelType::u16);
  add_type<std::int16_t>("i16", PixelType::i16);
  add_type<std::uint32_t>("u32", PixelType::u32);
  add_type<float>("f32", PixelType::f32);
  add_type<float>("f32_real", PixelType::f32, true);
  add_type<double>("f64_real", PixelType::f64, true);
  benchmark::RegisterBenchmark("hash/special", hash_band, false);
  benchmark::RegisterBenchmark("hash/portable", hash_band, true);
  benchmark::RunSpecifiedBenchmarks();
  benchmark::Shutdown();
  return 0;
}
