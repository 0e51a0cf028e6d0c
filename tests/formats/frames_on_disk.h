#pragma once
/// Frames made up for tests, folders for them, and whole files read back.

#include <doctest/doctest.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <limits>
#include <string>
#include <vector>

#include "formats/frame_file.h"
#include "formats/frame_writer.h"

namespace evenfield {

/// A folder that is gone at the end of the test.
class TestFolder {
 public:
  TestFolder() {
    std::string name = (std::filesystem::temp_directory_path() / "evenfield-test-XXXXXX").string();
    path_ = ::mkdtemp(name.data());
  }
  ~TestFolder() { std::filesystem::remove_all(path_); }
  TestFolder(const TestFolder&) = delete;
  TestFolder& operator=(const TestFolder&) = delete;
  std::filesystem::path operator/(const std::string& name) const { return path_ / name; }
  const std::filesystem::path& path() const { return path_; }

 private:
  std::filesystem::path path_;
};

using Bytes = std::vector<char>;

inline void write_bytes(const std::filesystem::path& path, const Bytes& bytes) {
  // A new file each time: some file systems wait for the disk when an old one is emptied and written again.
  std::filesystem::remove(path);
  std::ofstream(path, std::ios::binary).write(bytes.data(), static_cast<std::streamsize>(bytes.size()));
}

inline Bytes read_bytes(const std::filesystem::path& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), std::istreambuf_iterator<char>()};
}

/// Calls `use` with a value of the C++ type of `type`.
template <class Use>
auto with_type(PixelType type, Use use) {
  switch (type) {
    case PixelType::u8:
      return use(std::uint8_t{});
    case PixelType::i8:
      return use(std::int8_t{});
    case PixelType::u16:
      return use(std::uint16_t{});
    case PixelType::i16:
      return use(std::int16_t{});
    case PixelType::u32:
      return use(std::uint32_t{});
    case PixelType::i32:
      return use(std::int32_t{});
    case PixelType::f32:
      return use(float{});
    case PixelType::f64:
      break;
  }
  return use(double{});
}

/// Frame `number` of `shape`: both ends of the type's range, then numbers without pattern (a linear
/// congruential sequence), in runs here and there so that every compression has something to do. Bit for bit
/// reproducible.
inline Bytes made_up_frame(const FrameShape& shape, int number) {
  const auto count = static_cast<std::size_t>(shape.width) * static_cast<std::size_t>(shape.height);
  Bytes frame(count * bytes_per_pixel(shape.type));
  with_type(shape.type, [&](auto zero) {
    using Pixel = decltype(zero);
    std::uint64_t state = 12345U + static_cast<std::uint64_t>(number);
    Pixel value{};
    for (std::size_t i = 0; i < count; ++i) {
      if (i % 97 < 60) state = state * 6364136223846793005U + 1442695040888963407U;
      if constexpr (std::is_floating_point_v<Pixel>) {
        value = static_cast<Pixel>(static_cast<double>(state >> 40U) / 1024.0 - 7000.0);
      } else {
        value = static_cast<Pixel>(state >> 33U);
      }
      if (i == 0) value = std::numeric_limits<Pixel>::max();
      if (i == 1) value = std::numeric_limits<Pixel>::lowest();
      std::memcpy(frame.data() + i * sizeof value, &value, sizeof value);
    }
    return 0;
  });
  return frame;
}

inline std::vector<Bytes> made_up_stack(const FrameShape& shape, int frames) {
  std::vector<Bytes> stack;
  for (int i = 0; i < frames; ++i) stack.push_back(made_up_frame(shape, i));
  return stack;
}

inline Status write_stack(const std::filesystem::path& path,
                          const FrameShape& shape,
                          const std::vector<Bytes>& stack,
                          const WriteOptions& options) {
  auto writer = create_frames(path, shape, static_cast<int>(stack.size()), options);
  if (!writer) return writer.error();
  for (const Bytes& frame : stack) {
    Status added = (*writer)->add(frame.data());
    if (!added) return added;
  }
  return (*writer)->finish();
}

inline std::size_t frame_bytes(const FrameShape& shape) {
  return static_cast<std::size_t>(shape.width) * static_cast<std::size_t>(shape.height) *
         bytes_per_pixel(shape.type);
}

/// All frames of a file, decoded.
inline Result<std::vector<Bytes>> decode_all(const FrameFile& file) {
  auto decoder = open_decoder(file);
  if (!decoder) return decoder.error();
  std::vector<Bytes> frames;
  for (std::size_t page = 0; page < file.pages.size(); ++page) {
    Bytes frame(frame_bytes(file.pages[page].shape));
    const Status status = (*decoder)->decode(static_cast<int>(page) + 1, frame.data());
    if (!status) return status.error();
    frames.push_back(std::move(frame));
  }
  return frames;
}

/// A frame read by its extents, the way ingest reads it, with no code of the library.
inline Bytes read_by_extents(const std::filesystem::path& path, const FramePage& page) {
  const Bytes file = read_bytes(path);
  const std::size_t pixel = bytes_per_pixel(page.shape.type);
  const std::size_t row = static_cast<std::size_t>(page.shape.width) * pixel;
  Bytes frame(frame_bytes(page.shape));
  for (const RawExtent& extent : page.extents) {
    std::copy_n(
        file.begin() + static_cast<std::ptrdiff_t>(extent.offset),
        static_cast<std::size_t>(extent.rows) * row,
        frame.begin() + static_cast<std::ptrdiff_t>(static_cast<std::size_t>(extent.first_row) * row));
  }
  for (std::size_t at = 0; at < frame.size(); at += pixel) {
    const auto begin = frame.begin() + static_cast<std::ptrdiff_t>(at);
    if (page.encoding.swap_bytes) std::reverse(begin, begin + static_cast<std::ptrdiff_t>(pixel));
    // Little-endian machine: the sign is in the last byte.
    char& high = frame[at + pixel - 1];
    if (page.encoding.flip_sign_bit) high = static_cast<char>(high ^ '\x80');
  }
  return frame;
}

struct FrameStatistics {
  double mean, low, high;
};

inline FrameStatistics statistics_of(const Bytes& frame, PixelType type) {
  return with_type(type, [&](auto value) {
    FrameStatistics out{0.0, std::numeric_limits<double>::infinity(),
                        -std::numeric_limits<double>::infinity()};
    const std::size_t count = frame.size() / sizeof value;
    for (std::size_t i = 0; i < count; ++i) {
      std::memcpy(&value, frame.data() + i * sizeof value, sizeof value);
      const auto number = static_cast<double>(value);
      out.mean += number / static_cast<double>(count);
      out.low = std::min(out.low, number);
      out.high = std::max(out.high, number);
    }
    return out;
  });
}

/// The message of inspect() or, where that is content, of decoding; empty if all frames can be read.
inline std::string why_unreadable(const std::filesystem::path& path) {
  const auto file = inspect(path);
  if (!file) return to_line(file.error());
  const auto frames = decode_all(*file);
  return frames ? std::string() : to_line(frames.error());
}

inline constexpr PixelType kAllTypes[] = {PixelType::u8,  PixelType::i8,  PixelType::u16, PixelType::i16,
                                          PixelType::u32, PixelType::i32, PixelType::f32, PixelType::f64};

}  // namespace evenfield
