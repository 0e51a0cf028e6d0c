#include "model/high_pass.h"

#include <algorithm>
#include <array>
#include <cassert>
#include <numeric>
#include <string>

#include "base/image.h"
#include "base/parallel.h"

namespace evenfield {
namespace {

/// The result is made in tiles. Running sums start anew with each, and end before rounding could add up. Some
/// times the kernel, so that pixels read twice cost little; narrow, so that the rows of the sums stay in
/// cache.
constexpr int kTileRows = 256;
constexpr int kTileColumns = 512;
constexpr int kWidestBox = 9999;

Error error_of(std::string what) { return {Errc::input, {}, std::move(what)}; }

// Wider vectors where the machine has them; the same bits, since each sum keeps its order.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(__SANITIZE_ADDRESS__) && \
    !defined(__SANITIZE_THREAD__)
#define EVENFIELD_WIDE_VECTORS __attribute__((target_clones("avx2", "default")))
#else
#define EVENFIELD_WIDE_VECTORS
#endif

EVENFIELD_WIDE_VECTORS
void widen(const float* __restrict in, std::size_t count, double* __restrict out) {
  for (std::size_t x = 0; x < count; ++x) out[x] = static_cast<double>(in[x]);
}

EVENFIELD_WIDE_VECTORS
void add_two(const double* a, const double* b, std::size_t count, double* __restrict out) {
  for (std::size_t x = 0; x < count; ++x) out[x] = a[x] + b[x];
}

EVENFIELD_WIDE_VECTORS
void add_three(const double* a, const double* b, const double* c, std::size_t count, double* __restrict out) {
  for (std::size_t x = 0; x < count; ++x) out[x] = (a[x] + b[x]) + c[x];
}

EVENFIELD_WIDE_VECTORS
void add_to(const double* __restrict in, std::size_t count, double* __restrict out) {
  for (std::size_t x = 0; x < count; ++x) out[x] += in[x];
}

EVENFIELD_WIDE_VECTORS
void move_on(const double* __restrict row,
             std::size_t count,
             double* __restrict oldest,
             double* __restrict sums) {
  for (std::size_t x = 0; x < count; ++x) {
    const double pushed = row[x];
    sums[x] += pushed - oldest[x];
    oldest[x] = pushed;
  }
}

EVENFIELD_WIDE_VECTORS
void subtract(const float* __restrict pixels,
              const double* __restrict sums,
              double scale,
              std::size_t count,
              float* __restrict out) {
  for (std::size_t x = 0; x < count; ++x)
    out[x] = static_cast<float>(static_cast<double>(pixels[x]) - sums[x] * scale);
}

/// Sums over `width` neighbours of a row: `count` values in, count - width + 1 out. Made of sums over 1, 2,
/// 4, ... neighbours, several at a time; one running sum would wait for itself at each pixel. `powers` is for
/// its use.
void box_along_row(const double* in,
                   std::size_t count,
                   std::size_t width,
                   double* out,
                   std::vector<std::vector<double>>& powers) {
  const std::size_t results = count - width + 1;
  std::array<const double*, 32> parts{};  // that add up to the box, from its begin on
  std::size_t used = 0;
  const double* power = in;  // sums over `span` neighbours
  std::size_t offset = 0;
  std::size_t valid = count;
  for (std::size_t span = 1, k = 0; span <= width; span *= 2, ++k) {
    if (k > 0) {
      if (powers.size() < k) powers.emplace_back();
      if (powers[k - 1].size() < count) powers[k - 1].resize(count);
      valid -= span / 2;
      add_two(power, power + span / 2, valid, powers[k - 1].data());
      power = powers[k - 1].data();
    }
    if ((width & span) == 0) continue;
    parts[used++] = power + offset;
    offset += span;
  }
  if (used == 1) std::copy_n(parts[0], results, out);
  if (used == 2) add_two(parts[0], parts[1], results, out);
  if (used >= 3) add_three(parts[0], parts[1], parts[2], results, out);
  for (std::size_t i = 3; i < used; ++i) add_to(parts[i], results, out);
}

/// Sums over the last `height` rows of those that are pushed.
class BoxOverRows {
 public:
  BoxOverRows(std::size_t height, std::size_t most_columns)
      : height_(height), columns_(most_columns), ring_(height * most_columns), sums_(most_columns) {}

  void restart(std::size_t columns) {
    columns_ = columns;
    seen_ = 0;
    std::fill(sums_.begin(), sums_.end(), 0.0);
  }
  /// True once `height` rows are in: sums() then holds theirs.
  bool push(const double* __restrict row) {
    double* __restrict oldest = ring_.data() + seen_ % height_ * columns_;
    double* __restrict sums = sums_.data();
    if (seen_ < height_) std::fill_n(oldest, columns_, 0.0);
    move_on(row, columns_, oldest, sums);
    return ++seen_ >= height_;
  }
  const double* sums() const { return sums_.data(); }

 private:
  std::size_t height_, columns_, seen_ = 0;
  std::vector<double> ring_, sums_;
};

/// What one thread works in.
class TileFilter {
 public:
  TileFilter(std::span<const float> image, int width, const BoxChain& chain, HighPassImage& out)
      : image_(image), image_width_(static_cast<std::size_t>(width)), chain_(chain), out_(out) {
    for (const int box : chain.widths) scale_ /= static_cast<double>(box) * static_cast<double>(box);
  }

  /// `tile` is a part of the result.
  void run(const Rect& tile) {
    if (boxes_.empty()) {  // the thread that works here touches the memory first
      for (const int box : chain_.widths) boxes_.emplace_back(static_cast<std::size_t>(box), kTileColumns);
      row_.resize(kTileColumns + 2 * static_cast<std::size_t>(out_.border));
      next_.resize(row_.size());
    }
    const auto columns = static_cast<std::size_t>(tile.width);
    for (BoxOverRows& box : boxes_) box.restart(columns);
    int done = 0;
    for (int y = tile.y; done < tile.height; ++y) {
      const double* sums = low_pass_along(y, static_cast<std::size_t>(tile.x), columns);
      const bool filled = std::all_of(boxes_.begin(), boxes_.end(), [&](BoxOverRows& box) {
        if (!box.push(sums)) return false;
        sums = box.sums();
        return true;
      });
      if (filled)
        write(sums, static_cast<std::size_t>(tile.y + done++), static_cast<std::size_t>(tile.x), columns);
    }
  }

 private:
  /// Row `y` of the image summed along the row by each box: what column `x` of the result and those after it
  /// need.
  const double* low_pass_along(int y, std::size_t x, std::size_t columns) {
    std::size_t count = columns + 2 * static_cast<std::size_t>(out_.border);
    const float* pixels = image_.data() + static_cast<std::size_t>(y) * image_width_ + x;
    widen(pixels, count, row_.data());
    for (const int box : chain_.widths) {
      const auto width = static_cast<std::size_t>(box);
      box_along_row(row_.data(), count, width, next_.data(), powers_);
      row_.swap(next_);
      count -= width - 1;
    }
    return row_.data();
  }

  void write(const double* sums, std::size_t y, std::size_t x, std::size_t columns) {
    const auto border = static_cast<std::size_t>(out_.border);
    const float* pixels = image_.data() + (y + border) * image_width_ + x + border;
    float* values = out_.values.get() + y * static_cast<std::size_t>(out_.width) + x;
    subtract(pixels, sums, scale_, columns, values);
  }

  std::span<const float> image_;
  std::size_t image_width_;
  const BoxChain& chain_;
  HighPassImage& out_;
  double scale_ = 1;
  std::vector<BoxOverRows> boxes_;
  std::vector<double> row_, next_;
  std::vector<std::vector<double>> powers_;
};

}  // namespace

int BoxChain::border() const {
  return std::accumulate(widths.begin(), widths.end(), 0,
                         [](int reach, int width) { return reach + width - 1; }) /
         2;
}

Status BoxChain::check() const {
  if (widths.empty()) return error_of("low-pass: found no box, expected one or more");
  int reach = 0;
  for (const int width : widths) {
    if (width < 1 || width > kWidestBox || reach > kWidestBox)
      return error_of("low-pass: found a box " + std::to_string(width) + " pixels wide, expected 1 to " +
                      std::to_string(kWidestBox) + ", all together");
    reach += width - 1;
  }
  if (reach % 2 != 0)
    return error_of("low-pass: found boxes that together are " + std::to_string(reach + 1) +
                    " pixels wide, expected an odd number");
  return Done{};
}

std::vector<double> low_pass_kernel(const BoxChain& chain) {
  std::vector<double> kernel{1};
  for (const int width : chain.widths) {
    std::vector<double> wider(kernel.size() + static_cast<std::size_t>(width) - 1);
    for (std::size_t i = 0; i < kernel.size(); ++i)
      for (std::size_t j = 0; j < static_cast<std::size_t>(width); ++j) wider[i + j] += kernel[i] / width;
    kernel = std::move(wider);
  }
  return kernel;
}

double white_noise_gain(const BoxChain& chain) {
  const std::vector<double> kernel = low_pass_kernel(chain);
  const double centre = kernel[kernel.size() / 2];
  const double squares = std::inner_product(kernel.begin(), kernel.end(), kernel.begin(), 0.0);
  return 1 - 2 * centre * centre + squares * squares;
}

double line_pattern_gain(const BoxChain& chain) {
  const std::vector<double> kernel = low_pass_kernel(chain);
  return 1 - 2 * kernel[kernel.size() / 2] +
         std::inner_product(kernel.begin(), kernel.end(), kernel.begin(), 0.0);
}

Result<HighPassImage> high_pass(
    std::span<const float> image, int width, int height, const BoxChain& chain, int threads) {
  if (const Status good = chain.check(); !good) return good.error();
  HighPassImage out;
  out.border = chain.border();
  const int kernel = 2 * out.border + 1;
  if (width < kernel || height < kernel)
    return error_of("low-pass: found an image of " + std::to_string(width) + " x " + std::to_string(height) +
                    " pixels, expected " + std::to_string(kernel) + " x " + std::to_string(kernel) +
                    " or more");
  assert(image.size() == static_cast<std::size_t>(width) * static_cast<std::size_t>(height));
  out.width = width - 2 * out.border;
  out.height = height - 2 * out.border;
  out.values = std::make_unique_for_overwrite<float[]>(out.pixels());
  const int workers = std::max(threads, 1);
  const int across = (out.width + kTileColumns - 1) / kTileColumns;
  const int down = (out.height + kTileRows - 1) / kTileRows;
  std::vector<TileFilter> filters(static_cast<std::size_t>(workers), TileFilter(image, width, chain, out));
  const Status done = for_each_item(across * down, workers, [&](int item, int worker) -> Status {
    const int x = item % across * kTileColumns, y = item / across * kTileRows;
    filters[static_cast<std::size_t>(worker)].run(
        {x, y, std::min(kTileColumns, out.width - x), std::min(kTileRows, out.height - y)});
    return Done{};
  });
  if (!done) return done.error();
  return out;
}

}  // namespace evenfield
