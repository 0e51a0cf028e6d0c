#pragma once
/// Stacks of frames for tests of the engine, in raw files that the test writes and describes itself, so that
/// no reader stands between.

#include <unistd.h>

#include <cstdint>
#include <filesystem>
#include <fstream>
#include <functional>
#include <string>
#include <vector>

#include "base/error.h"
#include "formats/frame_file.h"
#include "ingest/open_stack.h"

namespace evenfield::test {

template <class T>
constexpr PixelType pixel_type() {
  if constexpr (std::is_same_v<T, std::uint8_t>) return PixelType::u8;
  if constexpr (std::is_same_v<T, std::int8_t>) return PixelType::i8;
  if constexpr (std::is_same_v<T, std::uint16_t>) return PixelType::u16;
  if constexpr (std::is_same_v<T, std::int16_t>) return PixelType::i16;
  if constexpr (std::is_same_v<T, std::uint32_t>) return PixelType::u32;
  if constexpr (std::is_same_v<T, std::int32_t>) return PixelType::i32;
  if constexpr (std::is_same_v<T, float>) return PixelType::f32;
  if constexpr (std::is_same_v<T, double>) return PixelType::f64;
}

/// `frames[f][y * width + x]`; the file goes with the value.
template <class T>
class RawFrames {
 public:
  RawFrames(int width, int height, std::vector<std::vector<T>> frames) : frames_(std::move(frames)) {
    static int number = 0;
    session_.shape = {width, height, pixel_type<T>()};
    path_ = std::filesystem::temp_directory_path() /
            ("evenfield_raw_" + std::to_string(::getpid()) + "_" + std::to_string(number++));
    std::ofstream out(path_, std::ios::binary);
    FrameFile file{path_, FileFormat::tiff, {}, {}};
    const std::uint64_t bytes =
        static_cast<std::uint64_t>(width) * static_cast<std::uint64_t>(height) * sizeof(T);
    for (std::size_t f = 0; f < frames_.size(); ++f) {
      out.write(reinterpret_cast<const char*>(frames_[f].data()), static_cast<std::streamsize>(bytes));
      file.pages.push_back({session_.shape, {{0, height, bytes * f}}, {}});
      series_.frames.push_back({0, static_cast<int>(f) + 1});
    }
    session_.files.push_back({path_, "raw"});
    files_.push_back(file);
  }
  ~RawFrames() { std::filesystem::remove(path_); }
  RawFrames(const RawFrames&) = delete;
  RawFrames& operator=(const RawFrames&) = delete;

  FrameStack stack() const { return *open_stack(session_, series_, files_, 1); }
  const FrameShape& shape() const { return session_.shape; }
  const std::vector<std::vector<T>>& frames() const { return frames_; }

 private:
  std::vector<std::vector<T>> frames_;
  Session session_;
  Series series_;
  std::vector<FrameFile> files_;
  std::filesystem::path path_;
};

/// width x height x count pixels from a function of (frame, x, y).
template <class T>
std::vector<std::vector<T>> make_frames(int width,
                                        int height,
                                        int count,
                                        const std::function<double(int, int, int)>& value) {
  std::vector<std::vector<T>> out;
  for (int f = 0; f < count; ++f) {
    std::vector<T> frame;
    for (int y = 0; y < height; ++y)
      for (int x = 0; x < width; ++x) frame.push_back(static_cast<T>(value(f, x, y)));
    out.push_back(std::move(frame));
  }
  return out;
}

}  // namespace evenfield::test
