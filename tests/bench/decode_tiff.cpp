/// Decodes every frame of the given TIFF files with libtiff in one thread and does nothing else with them:
/// what reading alone costs. Prints the number of frames and of bytes, and a few pixels' sum so that the work
/// is seen to be done.

#include <cstdint>
#include <cstdio>
#include <exception>

#include "tiff_frames.h"

int main(int argc, char** argv) {
  std::uint64_t frames = 0;
  std::uint64_t bytes = 0;
  std::uint64_t corner = 0;
  try {
    TiffFrame frame;
    for (int i = 1; i < argc; ++i) {
      for_each_tiff_frame(argv[i], frame, [&](const TiffFrame& read) {
        ++frames;
        bytes += read.pixels.size() * sizeof(std::uint16_t);
        corner += std::uint64_t{read.pixels.front()} + read.pixels.back();
      });
    }
  } catch (const std::exception& error) {
    std::fprintf(stderr, "%s\n", error.what());
    return 3;
  }
  std::printf("%llu frames, %llu bytes, corners %llu\n", static_cast<unsigned long long>(frames),
              static_cast<unsigned long long>(bytes), static_cast<unsigned long long>(corner));
  return 0;
}
