/// Decodes every frame of the given FITS files with CFITSIO in one thread, an image extension or a plane of a
/// cube at a time, and does nothing else with them: what reading alone costs. Prints the same line as
/// decode_tiff.cpp.

#include <fitsio.h>

#include <array>
#include <cstdint>
#include <cstdio>
#include <vector>

namespace {

struct Tally {
  std::uint64_t frames = 0;
  std::uint64_t bytes = 0;
  std::uint64_t corner = 0;
};

/// A CFITSIO status, 0 if all is well.
int decode(const char* path, std::vector<std::uint16_t>& pixels, Tally& tally) {
  fitsfile* file = nullptr;
  int status = 0;
  if (fits_open_diskfile(&file, path, READONLY, &status) != 0) return status;
  int extensions = 0;
  fits_get_num_hdus(file, &extensions, &status);
  for (int i = 1; i <= extensions && status == 0; ++i) {
    int type = 0;
    fits_movabs_hdu(file, i, &type, &status);
    int axes = 0;
    std::array<long, 3> size{1, 1, 1};
    if (type != IMAGE_HDU && fits_is_compressed_image(file, &status) == 0) continue;
    fits_get_img_dim(file, &axes, &status);
    if (status != 0 || axes < 2 || axes > 3) continue;
    fits_get_img_size(file, axes, size.data(), &status);
    pixels.resize(static_cast<std::size_t>(size[0]) * static_cast<std::size_t>(size[1]));
    for (long plane = 1; plane <= size[2] && status == 0; ++plane) {
      std::array<long, 3> first{1, 1, plane};
      fits_read_pix(file, TUSHORT, first.data(), static_cast<LONGLONG>(pixels.size()), nullptr, pixels.data(),
                    nullptr, &status);
      ++tally.frames;
      tally.bytes += pixels.size() * sizeof(std::uint16_t);
      tally.corner += std::uint64_t{pixels.front()} + pixels.back();
    }
  }
  int closed = 0;
  fits_close_file(file, &closed);
  return status;
}

}  // namespace

int main(int argc, char** argv) {
  std::vector<std::uint16_t> pixels;
  Tally tally;
  for (int i = 1; i < argc; ++i) {
    if (const int status = decode(argv[i], pixels, tally); status != 0) {
      std::array<char, FLEN_STATUS> text{};
      fits_get_errstatus(status, text.data());
      std::fprintf(stderr, "%s: %s, expected a FITS file of 16-bit frames\n", argv[i], text.data());
      return 3;
    }
  }
  std::printf("%llu frames, %llu bytes, corners %llu\n", static_cast<unsigned long long>(tally.frames),
              static_cast<unsigned long long>(tally.bytes), static_cast<unsigned long long>(tally.corner));
  return 0;
}
