#pragma once
/// An image less its low-pass: takes slow changes across a frame out before the spatial variance is formed.
/// The low-pass is a chain of centred boxes. That of EMVA 1288 R3.1 (from memory; METHODS 5.3) is a 7 x 7
/// box, an 11 x 11 box and the 3 x 3 binomial, which is a 2 x 2 box twice. Kernels sum to 1.

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "base/error.h"

namespace evenfield {

/// Square boxes one after the other, each `widths[i]` pixels wide.
struct BoxChain {
  std::vector<int> widths{7, 11, 2, 2};

  /// Pixels that the low-pass reaches to each side: 9.
  int border() const;
  /// Error `input` for no box, one narrower than 1, or a sum that is not odd in width: it has no centre
  /// pixel.
  Status check() const;
};

/// Along one axis, 2 border + 1 values; the kernel of the image is its product with itself.
std::vector<double> low_pass_kernel(const BoxChain& chain);

/// Variance of white noise after image - low-pass over that before: 1 - 2 h0 + sum h^2. 0.98850.
double white_noise_gain(const BoxChain& chain);

/// The same for a pattern that is the same in each row, or the same in each column: of columns or of rows
/// only. 0.88906: parts are therefore better told apart before the filter.
double line_pattern_gain(const BoxChain& chain);

/// Image - low-pass over the interior that the filter reaches in full: `border` pixels less on each side.
struct HighPassImage {
  int width = 0;
  int height = 0;
  int border = 0;
  std::unique_ptr<float[]> values;  ///< rows first, unit of the image

  std::size_t pixels() const { return static_cast<std::size_t>(width) * static_cast<std::size_t>(height); }
  std::span<const float> view() const { return {values.get(), pixels()}; }
};

/// `image` is rows first, `width` x `height`, all finite. Running sums in double precision, whose cost does
/// not depend on the boxes. The same bits for any number of threads. Error `input` if the image is smaller
/// than the kernel in width or height; or that of check().
Result<HighPassImage> high_pass(
    std::span<const float> image, int width, int height, const BoxChain& chain = {}, int threads = 1);

}  // namespace evenfield
