#include "accumulate/accumulate.h"

#include <algorithm>
#include <array>
#include <atomic>
#include <cmath>
#include <limits>
#include <map>
#include <memory>
#include <mutex>
#include <string_view>
#include <vector>

#include "accumulate/cell_kernel.h"
#include "accumulate/code_sample.h"
#include "accumulate/raw_memory.h"
#include "base/parallel.h"

namespace evenfield {
namespace {

using Hash = std::array<std::uint64_t, 2>;

/// Consecutive bands, one below the other, whose rows are read together: one band where rows can be had as
/// they are, several where they come in pieces.
struct Item {
  int first_band = 0;
  int bands = 0;
  int y = 0;
  int rows = 0;
};

std::vector<Item> make_items(const Geometry& geometry, int rows_apart) {
  constexpr int kRows = 32;  // a decoder is asked for so many at least
  const int wanted = rows_apart > 0 ? (kRows + rows_apart - 1) / rows_apart * rows_apart : 0;
  std::vector<Item> items;
  for (std::size_t i = 0; i < geometry.bands.size(); ++i) {
    const Band& band = geometry.bands[i];
    const bool goes_on = !items.empty() && items.back().y + items.back().rows == band.y &&
                         (items.back().rows < wanted ||
                          (wanted > 0 && band.y % rows_apart != 0 && items.back().rows < 2 * wanted));
    if (!goes_on) items.push_back({static_cast<int>(i), 0, band.y, 0});
    ++items.back().bands;
    items.back().rows += band.height;
  }
  return items;
}

/// What one band gives: per cell its statistics in each group and its squared totals, per frame its row sums.
struct BandResult {
  std::vector<CellStatistics> cells;  ///< [cell][group]
  std::vector<CellSquares> squares;   ///< [cell]
  std::vector<double> row_sums;       ///< [region of the band][frame][row of the band] sum over columns of y
};

/// And per frame its part of the hash.
struct ItemResult {
  std::vector<BandResult> bands;
  std::vector<Hash> hashes;  ///< [frame]
};

/// What one thread needs while it works on a band.
struct BandBuffers {
  RawMemory rows;       ///< [frame of the group][row][column]
  RawMemory totals;     ///< CellTotals [band of the item][cell]
  RawMemory workspace;  ///< of the kernels
};

/// Extreme codes that some thread has seen so far. What one thread does not know yet costs it a count, no
/// more.
struct KnownExtremes {
  explicit KnownExtremes(std::size_t blocks) : highest(blocks) {
    constexpr double kNone = std::numeric_limits<double>::infinity();
    lowest = kNone;
    for (std::atomic<double>& code : highest) code = -kNone;
  }
  std::atomic<double> lowest;                ///< in the region
  std::vector<std::atomic<double>> highest;  ///< [block]
};

/// Whichever value wins a race is one that was seen.
void lower_to(std::atomic<double>& known, double code) {
  if (code < known.load(std::memory_order_relaxed)) known.store(code, std::memory_order_relaxed);
}
void raise_to(std::atomic<double>& known, double code) {
  if (code > known.load(std::memory_order_relaxed)) known.store(code, std::memory_order_relaxed);
}

class Accumulator {
 public:
  Accumulator(const FrameStack& frames, const Geometry& geometry, const AccumulateOptions& options);
  Status measure(const Item& item, int worker, BandBuffers& buffers, ItemResult& out) const;
  void add(const Item& item, const ItemResult& result);
  SeriesStatistics finish();

 private:
  Status read_group(
      const Item& item, std::size_t group, int worker, std::byte* pixels, ItemResult& out) const;
  Status measure_cells(const Band& band,
                       std::size_t group,
                       const std::byte* pixels,
                       std::size_t frame_bytes,
                       CellTotals* totals,
                       BandBuffers& buffers,
                       BandResult& out) const;
  void sum_rows(const Band& band, BandResult& result) const;
  void add_cell(const Band& band, const Cell& cell, const BandResult& result, std::size_t index);

  const FrameStack& frames_;
  const Geometry& geometry_;
  const AccumulateOptions& options_;
  CellKernels kernels_;
  std::vector<int> sizes_;  ///< of groups
  std::vector<Hash> hashes_;
  std::vector<std::unique_ptr<KnownExtremes>> known_;  ///< [region]
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
    known_.push_back(std::make_unique<KnownExtremes>(blocks));
    region.centre.resize(blocks);
    region.pixels.resize(blocks);
    region.total_square.resize(blocks);
    region.lowest.resize(blocks);
    region.highest.resize(blocks);
    region.bits = {true, 0, ~std::uint64_t{0}};
    region.neighbours.resize(blocks);
    region.block_hits.resize(blocks);
    region.frame_hits.resize(hashes_.size());
    region.row_sums.resize(hashes_.size() * static_cast<std::size_t>(grid.rect.height));
    region.column_sums.resize(static_cast<std::size_t>(grid.rect.width));
    int first = 0;
    for (const int size : sizes_) {
      GroupStatistics group{first, size, {}, {}, {}};
      for (std::vector<double>* sums : {&group.sums, &group.squares, &group.with_total})
        sums->resize(blocks * static_cast<std::size_t>(size));
      region.groups.push_back(std::move(group));
      first += size;
    }
    out_.regions.push_back(std::move(region));
  }
}

/// The rows of the item in each frame of the group, one frame behind the other, and their hashes.
Status Accumulator::read_group(
    const Item& item, std::size_t group, int worker, std::byte* pixels, ItemResult& out) const {
  const FrameShape shape = frames_.shape();
  const std::size_t row_bytes = static_cast<std::size_t>(shape.width) * bytes_per_pixel(shape.type);
  for (int f = 0; f < sizes_[group]; ++f) {
    const int frame = out_.regions.front().groups[group].first_frame + f;
    if (const Status read = frames_.read_rows(frame, item.y, item.rows, pixels, worker); !read) return read;
    Hash& hash = out.hashes[static_cast<std::size_t>(frame)];
    for (int b = item.first_band; b < item.first_band + item.bands; ++b) {
      const Band& band = geometry_.bands[static_cast<std::size_t>(b)];
      for (int y = 0; y < band.height; ++y, pixels += row_bytes) {
        if (!band.hashed[static_cast<std::size_t>(y)]) continue;
        const Hash row = kernels_.hash(pixels, row_bytes, static_cast<std::uint64_t>(band.y + y));
        hash = {hash[0] + row[0], hash[1] + row[1]};
      }
    }
  }
  return Done{};
}

/// `pixels`: the band's first row in the first frame of the group; the others are `frame_bytes` apart.
Status Accumulator::measure_cells(const Band& band,
                                  std::size_t group,
                                  const std::byte* pixels,
                                  std::size_t frame_bytes,
                                  CellTotals* totals,
                                  BandBuffers& buffers,
                                  BandResult& out) const {
  const std::size_t pixel_bytes = bytes_per_pixel(frames_.shape().type);
  const bool one_group = sizes_.size() == 1;
  void* const workspace = buffers.workspace.room_for(kernels_.workspace_bytes);
  CellInput input;
  input.stride = frames_.shape().width;
  input.frames = sizes_[group];
  input.height = band.height;
  input.first_group = group == 0;
  input.last_group = group + 1 == sizes_.size();
  input.hit_threshold = sizes_[group] >= options_.fewest_frames_for_hits ? options_.hit_threshold : 0.0;
  for (std::size_t c = 0; c < band.cells.size(); ++c) {
    const Cell& cell = band.cells[c];
    input.width = cell.width;
    for (int f = 0; f < input.frames; ++f)
      input.pixels[static_cast<std::size_t>(f)] =
          pixels + frame_bytes * static_cast<std::size_t>(f) + pixel_bytes * static_cast<std::size_t>(cell.x);
    CellStatistics& statistics = out.cells[c * sizes_.size() + group];
    KnownExtremes& known = *known_[static_cast<std::size_t>(cell.region)];
    std::atomic<double>& highest = known.highest[static_cast<std::size_t>(cell.block)];
    input.known_lowest = known.lowest.load(std::memory_order_relaxed);
    input.known_highest = highest.load(std::memory_order_relaxed);
    kernels_.measure(input, totals[one_group ? 0 : c], workspace, statistics, out.squares[c]);
    if (statistics.bad_frame >= 0)
      return frames_.error_at(out_.regions.front().groups[group].first_frame + statistics.bad_frame,
                              "found a pixel that is not a finite number, expected finite pixels");
    lower_to(known.lowest, statistics.lowest.code);
    raise_to(highest, statistics.highest.code);
  }
  return Done{};
}

Status Accumulator::measure(const Item& item, int worker, BandBuffers& buffers, ItemResult& out) const {
  const FrameShape shape = frames_.shape();
  const std::size_t row_bytes = static_cast<std::size_t>(shape.width) * bytes_per_pixel(shape.type);
  const std::size_t frame_bytes = row_bytes * static_cast<std::size_t>(item.rows);
  std::byte* const pixels = buffers.rows.room_for(frame_bytes * kGroupFrames + kReadBeyond);
  out.bands.resize(static_cast<std::size_t>(item.bands));
  out.hashes.assign(hashes_.size(), Hash{});
  const Band* const bands = geometry_.bands.data() + item.first_band;
  std::size_t cells = 0;
  for (int b = 0; b < item.bands; ++b) {
    BandResult& result = out.bands[static_cast<std::size_t>(b)];
    result.cells.resize(bands[b].cells.size() * sizes_.size());
    result.squares.resize(bands[b].cells.size());
    cells += bands[b].cells.size();
  }
  const bool one_group = sizes_.size() == 1;
  // Plain numbers, written before they are read.
  auto* const totals = reinterpret_cast<CellTotals*>(
      buffers.totals.room_for(sizeof(CellTotals) * (one_group ? std::size_t{1} : cells)));
  for (std::size_t g = 0; g < sizes_.size(); ++g) {
    if (const Status read = read_group(item, g, worker, pixels, out); !read) return read;
    const std::byte* rows = pixels;
    CellTotals* of_band = totals;
    for (int b = 0; b < item.bands; ++b) {
      const Status measured = measure_cells(bands[b], g, rows, frame_bytes, of_band, buffers,
                                            out.bands[static_cast<std::size_t>(b)]);
      if (!measured) return measured;
      rows += row_bytes * static_cast<std::size_t>(bands[b].height);
      if (!one_group) of_band += bands[b].cells.size();
    }
  }
  for (int b = 0; b < item.bands; ++b) sum_rows(bands[b], out.bands[static_cast<std::size_t>(b)]);
  return Done{};
}

/// Row sums over the cells of each region. Done here, where threads work side by side, and in the order of
/// cells.
void Accumulator::sum_rows(const Band& band, BandResult& result) const {
  const auto height = static_cast<std::size_t>(band.height);
  const std::size_t frames = hashes_.size();
  result.row_sums.assign(band.regions.size() * frames * height, 0.0);
  for (std::size_t c = 0; c < band.cells.size(); ++c) {
    const Cell& cell = band.cells[c];
    const auto place =
        std::find(band.regions.begin(), band.regions.end(), cell.region) - band.regions.begin();
    double* sums = result.row_sums.data() + static_cast<std::size_t>(place) * frames * height;
    for (std::size_t g = 0; g < sizes_.size(); ++g) {
      const CellStatistics& s = result.cells[c * sizes_.size() + g];
      const double level = cell.width * s.centre;
      for (int f = 0; f < sizes_[g]; ++f, sums += height) {
        const double* rows = s.row_sums.data() + f * kCellRows;
        for (std::size_t y = 0; y < height; ++y) sums[y] += rows[y] + level;
      }
    }
  }
}

void merge_extreme(Extreme& into, const Extreme& other, bool highest, bool begun) {
  if (!begun || (highest ? other.code > into.code : other.code < into.code))
    into = other;
  else if (other.code == into.code)
    into.count += other.count;
}

void add_neighbours(NeighbourSums& into, const NeighbourSums& other) {
  into.pixels += other.pixels;
  into.cells += other.cells;
  into.square += other.square;
  for (std::size_t k = 0; k < kNeighbours; ++k) {
    into.pairs[k] += other.pairs[k];
    into.products[k] += other.products[k];
  }
}

void Accumulator::add_cell(const Band& band, const Cell& cell, const BandResult& result, std::size_t index) {
  RegionStatistics& region = out_.regions[static_cast<std::size_t>(cell.region)];
  const auto block = static_cast<std::size_t>(cell.block);
  const bool begun = region.pixels[block] > 0;
  const double pixels = cell.width * band.height;
  if (!begun) region.centre[block] = result.cells[index * sizes_.size()].centre;
  region.pixels[block] += static_cast<std::int64_t>(cell.width) * band.height;
  for (std::size_t g = 0; g < sizes_.size(); ++g) {
    const CellStatistics& s = result.cells[index * sizes_.size() + g];
    GroupStatistics& group = region.groups[g];
    const int frames = group.frames;
    // From the cell's own centre to the block's.
    const double shift = s.centre - region.centre[block];
    const std::size_t at = block * static_cast<std::size_t>(frames);
    double group_sum = 0;
    for (int i = 0; i < frames; ++i) group_sum += s.sums[static_cast<std::size_t>(i)];
    for (int i = 0; i < frames; ++i) {
      const auto k = static_cast<std::size_t>(i);
      const double sum = s.sums[k];
      group.sums[at + k] += sum + pixels * shift;
      group.squares[at + k] += s.squares[k] + 2 * shift * sum + pixels * shift * shift;
      group.with_total[at + k] +=
          s.with_total[k] + shift * (frames * sum + group_sum) + pixels * frames * shift * shift;
      region.frame_hits[static_cast<std::size_t>(group.first_frame + i)] +=
          s.hits[static_cast<std::size_t>(i)];
      region.block_hits[block] += s.hits[static_cast<std::size_t>(i)];
    }
    merge_extreme(region.lowest[block], s.lowest, false, begun || g > 0);
    merge_extreme(region.highest[block], s.highest, true, begun || g > 0);
    region.bits = {region.bits.valid && s.bits.valid, region.bits.any | s.bits.any,
                   region.bits.all & s.bits.all};
    if (g == 0) add_neighbours(region.neighbours[block], s.neighbours);
  }
  const CellSquares& squares = result.squares[index];
  const double shift = out_.frames * (squares.centre - region.centre[block]);
  region.total_square[block] += squares.square + 2 * shift * squares.sum + pixels * shift * shift;
  double* columns = region.column_sums.data() + (cell.x - region.rect.x);
  const double* sums = squares.column_sums.data();
  const double level = static_cast<double>(band.height) * out_.frames * squares.centre;
  for (int x = 0; x < cell.width; ++x) columns[x] += sums[x] + level;
}

void Accumulator::add(const Item& item, const ItemResult& result) {
  for (int b = 0; b < item.bands; ++b) {
    const Band& band = geometry_.bands[static_cast<std::size_t>(item.first_band + b)];
    const BandResult& part = result.bands[static_cast<std::size_t>(b)];
    for (std::size_t c = 0; c < band.cells.size(); ++c) add_cell(band, band.cells[c], part, c);
    const double* sums = part.row_sums.data();
    for (const int index : band.regions) {
      RegionStatistics& region = out_.regions[static_cast<std::size_t>(index)];
      const auto rows = static_cast<std::size_t>(region.rect.height);
      for (std::size_t f = 0; f < hashes_.size(); ++f, sums += band.height)
        std::copy_n(sums, band.height,
                    region.row_sums.data() + f * rows + static_cast<std::size_t>(band.y - region.rect.y));
    }
  }
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

}  // namespace

struct AccumulateBuffers::Impl {
  std::vector<BandBuffers> workers;
};
AccumulateBuffers::AccumulateBuffers() : impl_(std::make_unique<Impl>()) {}
AccumulateBuffers::~AccumulateBuffers() = default;

Result<SeriesStatistics> accumulate(const FrameStack& frames,
                                    const Geometry& geometry,
                                    const AccumulateOptions& options) {
  AccumulateBuffers buffers;
  return accumulate(frames, geometry, options, buffers);
}

Result<SeriesStatistics> accumulate(const FrameStack& frames,
                                    const Geometry& geometry,
                                    const AccumulateOptions& options,
                                    AccumulateBuffers& kept) {
  if (frames.frames() > kMostFrames)
    return frames.error_at(kMostFrames, "found more than " + std::to_string(kMostFrames) +
                                            " frames in one series, expected fewer; split the series");
  Accumulator accumulator(frames, geometry, options);
  const auto workers = static_cast<std::size_t>(std::max(1, options.threads));
  std::vector<BandBuffers>& buffers = kept.impl().workers;
  if (buffers.size() < workers) buffers.resize(workers);

  // Results that came before their turn wait here; as bands are handed out in order, there are few.
  std::mutex guard;
  std::map<int, std::unique_ptr<ItemResult>> waiting;
  std::vector<std::unique_ptr<ItemResult>> spare;
  int next = 0;
  const std::vector<Item> items = make_items(geometry, frames.rows_apart());
  const auto count = static_cast<int>(items.size());
  std::vector<double> codes;
  const Status done = for_each_item(count + 1, options.threads, [&](int number, int worker) -> Status {
    if (number == count) return sample_codes(frames, geometry, worker, codes);
    std::unique_ptr<ItemResult> result;
    {
      const std::lock_guard lock(guard);
      if (!spare.empty()) {
        result = std::move(spare.back());
        spare.pop_back();
      }
    }
    if (!result) result = std::make_unique<ItemResult>();
    const Status measured = accumulator.measure(items[static_cast<std::size_t>(number)], worker,
                                                buffers[static_cast<std::size_t>(worker)], *result);
    if (!measured) return measured;
    const std::lock_guard lock(guard);
    waiting.emplace(number, std::move(result));
    for (auto turn = waiting.find(next); turn != waiting.end(); turn = waiting.find(++next)) {
      accumulator.add(items[static_cast<std::size_t>(next)], *turn->second);
      spare.push_back(std::move(turn->second));
      waiting.erase(turn);
    }
    return Done{};
  });
  if (!done) return done.error();
  SeriesStatistics out = accumulator.finish();
  out.code_sample = std::move(codes);
  return out;
}

}  // namespace evenfield
