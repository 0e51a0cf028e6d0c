#include "model/spectrum.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <cstddef>
#include <limits>
#include <numbers>
#include <numeric>
#include <opencv2/core.hpp>
#include <string>

#include "base/parallel.h"

namespace evenfield {
namespace {

/// Lines that one piece of work takes; even, because two real lines make one complex one.
constexpr int kLinesPerPiece = 32;
/// The transform takes time in proportion to the prime factors of the length. With a larger one, lines are
/// transformed as a convolution of a length with small factors, which costs about three times as much.
constexpr int kLargestFactor = 23;

using Complex = cv::Complexd;

double square(const Complex& a) { return a.re * a.re + a.im * a.im; }

int largest_factor(int length) {
  int largest = 1;
  for (int factor = 2; factor * factor <= length; ++factor)
    while (length % factor == 0) {
      largest = factor;
      length /= factor;
    }
  return std::max(largest, length);
}

/// Discrete Fourier transform of complex lines of one length, not normalised. May be shared by threads.
class Transform {
 public:
  explicit Transform(int length) : length_(length) {
    if (largest_factor(length) <= kLargestFactor) return;
    padded_ = cv::getOptimalDFTSize(2 * length - 1);
    // v n = (v^2 + n^2 - (v - n)^2) / 2, so that sum_n y[n] exp(-2 pi i v n / N) is a convolution with a
    // chirp.
    chirp_.reserve(static_cast<std::size_t>(length));
    for (std::int64_t n = 0; n < length; ++n) {
      const std::int64_t turns = n * n % (2 * static_cast<std::int64_t>(length));  // keeps the angle's digits
      const double angle = std::numbers::pi * static_cast<double>(turns) / length;
      chirp_.push_back({std::cos(angle), -std::sin(angle)});
    }
    filter_ = cv::Mat(1, padded_, CV_64FC2, cv::Scalar::all(0));
    auto* filter = filter_.ptr<Complex>();
    for (int n = 0; n < length; ++n) {
      filter[n] = chirp_[static_cast<std::size_t>(n)].conj();
      if (n > 0) filter[padded_ - n] = filter[n];
    }
    cv::dft(filter_, filter_);
  }

  /// Each row of `lines` becomes its transform.
  void run(cv::Mat& lines) const {
    if (chirp_.empty()) {
      cv::dft(lines, lines, cv::DFT_ROWS);
      return;
    }
    cv::Mat wide(lines.rows, padded_, CV_64FC2, cv::Scalar::all(0));
    for (int m = 0; m < lines.rows; ++m)
      for (int n = 0; n < length_; ++n)
        wide.ptr<Complex>(m)[n] = lines.ptr<Complex>(m)[n] * chirp_[static_cast<std::size_t>(n)];
    cv::dft(wide, wide, cv::DFT_ROWS);
    for (int m = 0; m < lines.rows; ++m)
      for (int v = 0; v < padded_; ++v)
        wide.ptr<Complex>(m)[v] = wide.ptr<Complex>(m)[v] * filter_.ptr<Complex>()[v];
    cv::dft(wide, wide, cv::DFT_ROWS | cv::DFT_INVERSE | cv::DFT_SCALE);
    for (int m = 0; m < lines.rows; ++m)
      for (int v = 0; v < length_; ++v)
        lines.ptr<Complex>(m)[v] = wide.ptr<Complex>(m)[v] * chirp_[static_cast<std::size_t>(v)];
  }

 private:
  int length_;
  int padded_ = 0;
  std::vector<Complex> chirp_;  ///< exp(-pi i n^2 / N); empty where the length has small factors only
  cv::Mat filter_;
};

/// The lines of an image, and how far apart their pixels lie in memory.
struct Lines {
  std::span<const float> image;
  int length = 0, count = 0;
  std::size_t between_pixels = 1, between_lines = 1;
  double mean = 0;

  Lines(std::span<const float> pixels, int width, int height, LineDirection direction) : image(pixels) {
    const bool rows = direction == LineDirection::rows;
    length = rows ? width : height;
    count = rows ? height : width;
    between_pixels = rows ? 1 : static_cast<std::size_t>(width);
    between_lines = rows ? static_cast<std::size_t>(width) : 1;
    // Row by row, in both directions the same.
    double sum = 0;
    for (int y = 0; y < height; ++y) {
      const auto row = image.subspan(static_cast<std::size_t>(y) * static_cast<std::size_t>(width),
                                     static_cast<std::size_t>(width));
      sum += std::accumulate(row.begin(), row.end(), 0.0);
    }
    mean = sum / static_cast<double>(image.size());
  }
  double at(int line, int pixel) const {
    return static_cast<double>(image[static_cast<std::size_t>(line) * between_lines +
                                     static_cast<std::size_t>(pixel) * between_pixels]) -
           mean;
  }
};

/// Sum over lines `first` .. `first + count - 1` of |Y[v]|^2, v = 0 .. N/2, not normalised. Two lines are the
/// real and the imaginary part of one: |A[v]|^2 + |B[v]|^2 = (|Z[v]|^2 + |Z[N-v]|^2) / 2.
std::vector<double> power_of(const Lines& lines, int first, int count, const Transform& transform) {
  // Not Mat::zeros(): its expression is made with a table that OpenCV sets up at the first call, in whatever
  // thread.
  cv::Mat pairs((count + 1) / 2, lines.length, CV_64FC2, cv::Scalar::all(0));
  // Pixels outside, lines inside: for columns that reads memory in its order.
  for (int n = 0; n < lines.length; ++n)
    for (int m = 0; m < count; ++m) {
      Complex& to = pairs.ptr<Complex>(m / 2)[n];
      (m % 2 == 0 ? to.re : to.im) = lines.at(first + m, n);
    }
  transform.run(pairs);
  std::vector<double> power(static_cast<std::size_t>(lines.length / 2) + 1);
  for (int m = 0; m < pairs.rows; ++m) {
    const auto* z = pairs.ptr<Complex>(m);
    for (int v = 0; v <= lines.length / 2; ++v)
      power[static_cast<std::size_t>(v)] += (square(z[v]) + square(z[(lines.length - v) % lines.length])) / 2;
  }
  return power;
}

}  // namespace

Result<Spectrum> line_spectrum(
    std::span<const float> image, int width, int height, LineDirection direction, int threads) {
  if (width < 1 || height < 1)
    return Error{Errc::input,
                 {},
                 "spectrum: found an image of " + std::to_string(width) + " x " + std::to_string(height) +
                     " pixels, expected one or more"};
  assert(image.size() == static_cast<std::size_t>(width) * static_cast<std::size_t>(height));
  const Lines lines(image, width, height, direction);
  try {
    const Transform transform(lines.length);
    const int pieces = (lines.count + kLinesPerPiece - 1) / kLinesPerPiece;
    std::vector<std::vector<double>> powers(static_cast<std::size_t>(pieces));
    const Status done = for_each_item(pieces, std::max(threads, 1), [&](int piece, int) -> Status {
      const int first = piece * kLinesPerPiece;
      try {
        powers[static_cast<std::size_t>(piece)] =
            power_of(lines, first, std::min(kLinesPerPiece, lines.count - first), transform);
      } catch (const cv::Exception& exception) {
        return Error{Errc::input, {}, "spectrum: " + exception.err};
      }
      return Done{};
    });
    if (!done) return done.error();
    Spectrum out{lines.length, lines.count, std::vector<double>(powers.front().size())};
    // In the order of the lines, whichever thread was first.
    for (const std::vector<double>& power : powers)
      for (std::size_t v = 0; v < power.size(); ++v) out.power[v] += power[v];
    for (double& power : out.power)
      power /= static_cast<double>(lines.length) * static_cast<double>(lines.count);
    return out;
  } catch (const cv::Exception& exception) {
    return Error{Errc::input, {}, "spectrum: " + exception.err};
  }
}

double spectrum_variance(const Spectrum& spectrum) {
  // All but p[0] and, for even lengths, p[N/2] stand for two frequencies.
  double sum = 0;
  for (std::size_t v = 0; v < spectrum.power.size(); ++v) {
    const bool single = v == 0 || 2 * v == static_cast<std::size_t>(spectrum.length);
    sum += (single ? 1 : 2) * spectrum.power[v];
  }
  return sum / spectrum.length;
}

double white_part(const Spectrum& spectrum) {
  if (spectrum.power.size() < 2) return 0;
  std::vector<double> sorted(spectrum.power.begin() + 1, spectrum.power.end());
  const auto middle = sorted.begin() + static_cast<std::ptrdiff_t>(sorted.size() / 2);
  std::nth_element(sorted.begin(), middle, sorted.end());
  if (sorted.size() % 2 == 1) return *middle;
  return (*middle + *std::max_element(sorted.begin(), middle)) / 2;
}

Spectrum without_noise(Spectrum spectrum, double noise_variance) {
  for (double& power : spectrum.power) power -= noise_variance;
  return spectrum;
}

double non_whiteness(const Spectrum& spectrum) {
  const double white = white_part(spectrum);
  return white > 0 ? spectrum_variance(spectrum) / white : std::numeric_limits<double>::quiet_NaN();
}

}  // namespace evenfield
