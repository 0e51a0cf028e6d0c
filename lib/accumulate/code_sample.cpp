#include "accumulate/code_sample.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>

#include "accumulate/raw_memory.h"

namespace evenfield {
namespace {

/// The different finite codes among these pixels, ascending.
template <class T>
std::vector<double> different_codes(const std::byte* bytes, std::size_t count) {
  const auto* pixels = reinterpret_cast<const T*>(bytes);
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

}  // namespace

Status sample_codes(const FrameStack& frames,
                    const Geometry& geometry,
                    int worker,
                    std::vector<double>& out) {
  constexpr int kSamplePixels = 65536;
  const FrameShape shape = frames.shape();
  const Rect& rect = geometry.grids.front().rect;
  const int rows = std::clamp(kSamplePixels / shape.width, 1, rect.height);
  const int y = rect.y + (rect.height - rows) / 2;
  const std::size_t count = static_cast<std::size_t>(shape.width) * static_cast<std::size_t>(rows);
  RawMemory memory;
  std::byte* bytes = memory.room_for(count * bytes_per_pixel(shape.type));
  if (const Status read = frames.read_rows(0, y, rows, bytes, worker); !read) return read;
  switch (shape.type) {
    case PixelType::u8:
      out = different_codes<std::uint8_t>(bytes, count);
      break;
    case PixelType::i8:
      out = different_codes<std::int8_t>(bytes, count);
      break;
    case PixelType::u16:
      out = different_codes<std::uint16_t>(bytes, count);
      break;
    case PixelType::i16:
      out = different_codes<std::int16_t>(bytes, count);
      break;
    case PixelType::u32:
      out = different_codes<std::uint32_t>(bytes, count);
      break;
    case PixelType::i32:
      out = different_codes<std::int32_t>(bytes, count);
      break;
    case PixelType::f32:
      out = different_codes<float>(bytes, count);
      break;
    case PixelType::f64:
      out = different_codes<double>(bytes, count);
      break;
  }
  return Done{};
}

}  // namespace evenfield
