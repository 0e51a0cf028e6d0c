#pragma once
/// An image without symmetry that any program can make again: (7919 x + 104729 y + 31 x y) mod 1009.

#include <cstddef>
#include <vector>

inline std::vector<float> numbered_image(int width, int height) {
  std::vector<float> image;
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x)
      image.push_back(static_cast<float>((7919 * x + 104729 * y + 31 * x * y) % 1009));
  return image;
}
