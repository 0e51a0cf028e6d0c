#include "accumulate/accumulate.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <memory>
#include <mutex>
#include <string_view>
#include <vector>

#include "accumulate/cell_kernel.h"
#include "base/parallel.h"

namespace evenfield {
namespace {

using Hash = std::array<std::uint64_t, 2>;

/// What one band gives: per cell its statistics in each group and its squared totals, per frame its part of
/// the hash.
struct BandResult {
  std::vector<CellStatistics> cells;  ///< [cell][group]
  std::vector<CellSquares> squares;   ///< [cell]
  std::vector<double> total_centres;  ///< [cell]
  std::vector<Hash> hashes;           ///< [frame]
};

/// What one thread needs while it works on a band.
struct BandBuffers {
  std::vector<std::byte> rows;     ///< [frame of the group][row][column]
  std::vector<CellTotals> totals;  ///< [cell]
  std::vector<std::vector<std::pair<double, double>>>
      known;  ///< [region][block] lowest and highest code seen by this thread
};

class Accumulator {
 public:
  Accumulator(const FrameStack& frames, const Geometry& geometry, const AccumulateOptions& options);
  Status measure(int band, BandBuffers& buffers, BandResult& out) const;
  void add(int band, const BandResult& result);
  SeriesStatistics finish();
  int groups() const { return static_cast<int>(sizes_.size()); }

 private:
  void add_cell(const Band& band, const Cell& cell, const BandResult& result, std::size_t index);

  const FrameStack& frames_;
  const Geometry& geometry_;
  const AccumulateOptions& options_;
  CellKernels kernels_;
  std::vector<int> sizes_;  ///< of groups
  std::vector<Hash> hashes_;
  SeriesStatistics out_;
};

Accumulator::Accumulator(const FrameStack& frames, const Geometry& geometry, const AccumulateOptions& options)
    : frames_(frames),
      geometry_(geometry),
      options_(options),
      kernels_(cell_kernels(frames.shape().type, options.portable_kernels)),
      sizes_(balanced_groups(frames.frames())),
      hashes_(static_cast<std::size_t>(frames.frames())) {
  out_.frames = frames.frames();
  out_.shape = frames.shape();
  for (const BlockGrid& grid : geometry.grids) {
    RegionStatistics region;
    region.rect = grid.rect;
    region.columns = grid.columns;
    region.rows = grid.rows;
    const auto blocks = static_cast<std::size_t>(grid.columns) * static_cast<std::size_t>(grid.rows);
    region.centre.resize(blocks);
    region.pixels.resize(blocks);
    region.total_square.resize(blocks);
    region.lowest.resize(blocks);
    region.highest.resize(blocks);
    region.block_hits.resize(blocks);
    region.frame_hits.resize(hashes_.size());
    region.row_sums.resize(hashes_.size() * static_cast<std::size_t>(grid.rect.height));
    region.column_sums.resize(static_cast<std::size_t>(grid.rect.width));
    int first = 0;
    for (const int size : sizes_) {
      GroupStatistics group{first, size, {}, {}};
      group.sums.resize(blocks * static_cast<std::size_t>(size));
      group.gram.resize(blocks * pair_count(size));
      region.groups.push_back(std::move(group));
      first += size;
    }
    out_.regions.push_back(std::move(region));
  }
}

Status Accumulator::measure(int band_index, BandBuffers& buffers, BandResult& out) const {
  const Band& band = geometry_.bands[static_cast<std::size_t>(band_index)];
  const FrameShape shape = frames_.shape();
  const std::size_t pixel_bytes = bytes_per_pixel(shape.type);
  const std::size_t row_bytes = static_cast<std::size_t>(shape.width) * pixel_bytes;
  const std::size_t frame_bytes = row_bytes * static_cast<std::size_t>(band.height);
  buffers.rows.resize(std::max(buffers.rows.size(), frame_bytes * kGroupFrames));
  buffers.totals.resize(std::max(buffers.totals.size(), band.cells.size()));
  out.cells.resize(band.cells.size() * sizes_.size());
  out.squares.resize(band.cells.size());
  out.total_centres.resize(band.cells.size());
  out.hashes.assign(hashes_.size(), Hash{});

  int first = 0;
  for (std::size_t g = 0; g < sizes_.size(); ++g) {
    CellInput input;
    input.stride = shape.width;
    input.frames = sizes_[g];
    input.height = band.height;
    input.first_group = g == 0;
    input.hit_threshold = sizes_[g] >= options_.fewest_frames_for_hits ? options_.hit_threshold : 0.0;
    for (int f = 0; f < sizes_[g]; ++f) {
      std::byte* rows = buffers.rows.data() + frame_bytes * static_cast<std::size_t>(f);
      if (const Status read = frames_.read_rows(first + f, band.y, band.height, rows); !read) return read;
      Hash& hash = out.hashes[static_cast<std::size_t>(first + f)];
      for (int y = 0; y < band.height; ++y) {
        if (!band.hashed[static_cast<std::size_t>(y)]) continue;
        const Hash row = kernels_.hash(rows + row_bytes * static_cast<std::size_t>(y), row_bytes,
                                       static_cast<std::uint64_t>(band.y + y));
        hash = {hash[0] + row[0], hash[1] + row[1]};
      }
    }
    for (std::size_t c = 0; c < band.cells.size(); ++c) {
      const Cell& cell = band.cells[c];
      input.width = cell.width;
      for (int f = 0; f < sizes_[g]; ++f)
        input.pixels[static_cast<std::size_t>(f)] = buffers.rows.data() +
                                                    frame_bytes * static_cast<std::size_t>(f) +
                                                    pixel_bytes * static_cast<std::size_t>(cell.x);
      CellStatistics& statistics = out.cells[c * sizes_.size() + g];
      auto& [lowest, highest] =
          buffers.known[static_cast<std::size_t>(cell.region)][static_cast<std::size_t>(cell.block)];
      input.known_lowest = lowest;
      input.known_highest = highest;
      kernels_.measure(input, buffers.totals[c], statistics);
      if (statistics.bad_frame >= 0)
        return frames_.error_at(first + statistics.bad_frame,
                                "found a pixel that is not a finite number, expected finite pixels");
      lowest = std::min(lowest, statistics.lowest.code);
      highest = std::max(highest, statistics.highest.code);
    }
    first += sizes_[g];
  }
  for (std::size_t c = 0; c < band.cells.size(); ++c) {
    kernels_.square(buffers.totals[c], band.cells[c].width, band.height, out.squares[c]);
    out.total_centres[c] = buffers.totals[c].centre;
  }
  return Done{};
}

void merge_extreme(Extreme& into, const Extreme& other, bool highest, bool begun) {
  if (!begun || (highest ? other.code > into.code : other.code < into.code))
    into = other;
  else if (other.code == into.code)
    into.count += other.count;
}

void Accumulator::add_cell(const Band& band, const Cell& cell, const BandResult& result, std::size_t index) {
  RegionStatistics& region = out_.regions[static_cast<std::size_t>(cell.region)];
  const auto block = static_cast<std::size_t>(cell.block);
  const bool begun = region.pixels[block] > 0;
  const double pixels = cell.width * band.height;
  const auto height = static_cast<std::size_t>(region.rect.height);
  if (!begun) region.centre[block] = result.cells[index * sizes_.size()].centre;
  region.pixels[block] += static_cast<std::int64_t>(cell.width) * band.height;
  for (std::size_t g = 0; g < sizes_.size(); ++g) {
    const CellStatistics& s = result.cells[index * sizes_.size() + g];
    GroupStatistics& group = region.groups[g];
    const int frames = group.frames;
    // From the cell's own centre to the block's.
    const double shift = s.centre - region.centre[block];
    double* sums = group.sums.data() + block * static_cast<std::size_t>(frames);
    double* gram = group.gram.data() + block * pair_count(frames);
    for (int i = 0; i < frames; ++i) {
      const double sum = s.sums[static_cast<std::size_t>(i)];
      sums[i] += sum + pixels * shift;
      for (int j = i; j < frames; ++j)
        gram[pair_index(i, j, frames)] += s.gram[pair_index(i, j, frames)] +
                                          shift * (sum + s.sums[static_cast<std::size_t>(j)]) +
                                          pixels * shift * shift;
      region.frame_hits[static_cast<std::size_t>(group.first_frame + i)] +=
          s.hits[static_cast<std::size_t>(i)];
      region.block_hits[block] += s.hits[static_cast<std::size_t>(i)];
      double* rows = region.row_sums.data() + static_cast<std::size_t>(group.first_frame + i) * height +
                     static_cast<std::size_t>(band.y - region.rect.y);
      for (int y = 0; y < band.height; ++y)
        rows[y] += s.row_sums[static_cast<std::size_t>(i * kCellRows + y)] + cell.width * s.centre;
    }
    merge_extreme(region.lowest[block], s.lowest, false, begun || g > 0);
    merge_extreme(region.highest[block], s.highest, true, begun || g > 0);
  }
  const CellSquares& squares = result.squares[index];
  const double shift = out_.frames * (result.total_centres[index] - region.centre[block]);
  region.total_square[block] += squares.square + 2 * shift * squares.sum + pixels * shift * shift;
  double* columns = region.column_sums.data() + (cell.x - region.rect.x);
  for (int x = 0; x < cell.width; ++x)
    columns[x] += squares.column_sums[static_cast<std::size_t>(x)] +
                  static_cast<double>(band.height) * out_.frames * result.total_centres[index];
}

void Accumulator::add(int band_index, const BandResult& result) {
  const Band& band = geometry_.bands[static_cast<std::size_t>(band_index)];
  for (std::size_t c = 0; c < band.cells.size(); ++c) add_cell(band, band.cells[c], result, c);
  for (std::size_t f = 0; f < hashes_.size(); ++f)
    hashes_[f] = {hashes_[f][0] + result.hashes[f][0], hashes_[f][1] + result.hashes[f][1]};
}

SeriesStatistics Accumulator::finish() {
  constexpr std::string_view kHex = "0123456789abcdef";
  for (const Hash& hash : hashes_) {
    std::string digits;
    for (const std::uint64_t word : {hash[1], hash[0]})
      for (int shift = 60; shift >= 0; shift -= 4)
        digits += kHex[(word >> static_cast<unsigned>(shift)) & 15U];
    out_.fingerprints.push_back(std::move(digits));
  }
  return std::move(out_);
}

/// The different finite codes among these pixels, ascending.
template <class T>
std::vector<double> different_codes(const std::vector<std::byte>& bytes) {
  const auto* pixels = reinterpret_cast<const T*>(bytes.data());
  const std::size_t count = bytes.size() / sizeof(T);
  std::vector<double> codes;
  if constexpr (std::is_integral_v<T> && sizeof(T) <= 2) {
    // A mark for each code there can be costs less than sorting.
    constexpr int kLowest = std::numeric_limits<T>::min();
    std::vector<char> seen(std::size_t{1} << (8 * sizeof(T)), 0);
    for (std::size_t i = 0; i < count; ++i) seen[static_cast<std::size_t>(pixels[i] - kLowest)] = 1;
    for (std::size_t i = 0; i < seen.size(); ++i)
      if (seen[i] != 0) codes.push_back(static_cast<double>(i) + kLowest);
  } else {
    for (std::size_t i = 0; i < count; ++i)
      if (std::isfinite(static_cast<double>(pixels[i]))) codes.push_back(static_cast<double>(pixels[i]));
    std::sort(codes.begin(), codes.end());
    codes.erase(std::unique(codes.begin(), codes.end()), codes.end());
  }
  return codes;
}

/// Codes that occur in the middle rows of the first region in the first frame, in about 65 000 pixels.
Result<std::vector<double>> code_sample(const FrameStack& frames, const Geometry& geometry) {
  constexpr int kSamplePixels = 65536;
  const FrameShape shape = frames.shape();
  const Rect& rect = geometry.grids.front().rect;
  const int rows = std::clamp(kSamplePixels / shape.width, 1, rect.height);
  const int y = rect.y + (rect.height - rows) / 2;
  const std::size_t count = static_cast<std::size_t>(shape.width) * static_cast<std::size_t>(rows);
  std::vector<std::byte> bytes(count * bytes_per_pixel(shape.type));
  if (const Status read = frames.read_rows(0, y, rows, bytes.data()); !read) return read.error();
  switch (shape.type) {
    case PixelType::u8:
      return different_codes<std::uint8_t>(bytes);
    case PixelType::i8:
      return different_codes<std::int8_t>(bytes);
    case PixelType::u16:
      return different_codes<std::uint16_t>(bytes);
    case PixelType::i16:
      return different_codes<std::int16_t>(bytes);
    case PixelType::u32:
      return different_codes<std::uint32_t>(bytes);
    case PixelType::i32:
      return different_codes<std::int32_t>(bytes);
    case PixelType::f32:
      return different_codes<float>(bytes);
    case PixelType::f64:
      return different_codes<double>(bytes);
  }
  return std::vector<double>{};
}

}  // namespace

Result<SeriesStatistics> accumulate(const FrameStack& frames,
                                    const Geometry& geometry,
                                    const AccumulateOptions& options) {
  if (frames.frames() > kMostFrames)
    return frames.error_at(kMostFrames, "found more than " + std::to_string(kMostFrames) +
                                            " frames in one series, expected fewer; split the series");
  Accumulator accumulator(frames, geometry, options);
  const auto workers = static_cast<std::size_t>(std::max(1, options.threads));
  std::vector<BandBuffers> buffers(workers);
  for (BandBuffers& buffer : buffers)
    for (const BlockGrid& grid : geometry.grids) {
      constexpr double kNone = std::numeric_limits<double>::infinity();
      buffer.known.emplace_back(static_cast<std::size_t>(grid.columns * grid.rows), std::pair(kNone, -kNone));
    }

  // Results that came before their turn wait here; as bands are handed out in order, there are few.
  std::mutex guard;
  std::map<int, std::unique_ptr<BandResult>> waiting;
  std::vector<std::unique_ptr<BandResult>> spare;
  int next = 0;
  const Status done = for_each_item(
      static_cast<int>(geometry.bands.size()), options.threads, [&](int band, int worker) -> Status {
        std::unique_ptr<BandResult> result;
        {
          const std::lock_guard lock(guard);
          if (!spare.empty()) {
            result = std::move(spare.back());
            spare.pop_back();
          }
        }
        if (!result) result = std::make_unique<BandResult>();
        if (const Status measured =
                accumulator.measure(band, buffers[static_cast<std::size_t>(worker)], *result);
            !measured)
          return measured;
        const std::lock_guard lock(guard);
        waiting.emplace(band, std::move(result));
        for (auto turn = waiting.find(next); turn != waiting.end(); turn = waiting.find(++next)) {
          accumulator.add(next, *turn->second);
          spare.push_back(std::move(turn->second));
          waiting.erase(turn);
        }
        return Done{};
      });
  if (!done) return done.error();
  SeriesStatistics out = accumulator.finish();
  auto codes = code_sample(frames, geometry);
  if (!codes) return codes.error();
  out.code_sample = std::move(*codes);
  return out;
}

}  // namespace evenfield
