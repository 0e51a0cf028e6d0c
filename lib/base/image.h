#pragma once
/// Pixels: rows first in memory, coordinates (x, y) = (column, row) of the stored order, from 0, never
/// flipped. Rectangles are half-open: a pixel is inside if x <= column < x + width, and likewise for rows.

#include <cstddef>
#include <cstdint>

namespace evenfield {

enum class PixelType : std::uint8_t { u8, i8, u16, i16, u32, i32, f32, f64 };

constexpr std::size_t bytes_per_pixel(PixelType type) {
  switch (type) {
    case PixelType::u8:
    case PixelType::i8:
      return 1;
    case PixelType::u16:
    case PixelType::i16:
      return 2;
    case PixelType::u32:
    case PixelType::i32:
    case PixelType::f32:
      return 4;
    case PixelType::f64:
      return 8;
  }
  return 0;
}

constexpr bool is_floating(PixelType type) { return type == PixelType::f32 || type == PixelType::f64; }

/// "unsigned 16 bit", as messages say it.
constexpr const char* name_of(PixelType type) {
  switch (type) {
    case PixelType::u8:
      return "unsigned 8 bit";
    case PixelType::i8:
      return "signed 8 bit";
    case PixelType::u16:
      return "unsigned 16 bit";
    case PixelType::i16:
      return "signed 16 bit";
    case PixelType::u32:
      return "unsigned 32 bit";
    case PixelType::i32:
      return "signed 32 bit";
    case PixelType::f32:
      return "32 bit float";
    case PixelType::f64:
      return "64 bit float";
  }
  return "";
}

struct FrameShape {
  int width = 0;
  int height = 0;
  PixelType type = PixelType::u16;
  friend bool operator==(const FrameShape&, const FrameShape&) = default;
};

struct Rect {
  int x = 0;
  int y = 0;
  int width = 0;
  int height = 0;
  friend bool operator==(const Rect&, const Rect&) = default;
};

}  // namespace evenfield
