#pragma once
/// Reads 16-bit single-sample TIFF stacks with libtiff and nothing of ours, for the programs that evenfield
/// is timed against. Throws std::runtime_error that names the file.

#include <tiffio.h>

#include <cstddef>
#include <cstdint>
#include <memory>
#include <stdexcept>
#include <string>
#include <vector>

struct TiffFrame {
  std::uint32_t width = 0;
  std::uint32_t height = 0;
  std::vector<std::uint16_t> pixels;
};

/// Calls take(frame) for each page of the file; the frame's buffer is reused.
template <class Take>
void for_each_tiff_frame(const std::string& path, TiffFrame& frame, Take take) {
  struct Close {
    void operator()(TIFF* tiff) const { TIFFClose(tiff); }
  };
  const std::unique_ptr<TIFF, Close> tiff(TIFFOpen(path.c_str(), "r"));
  if (!tiff) throw std::runtime_error(path + ": cannot be opened, expected a TIFF file");
  do {
    std::uint16_t bits = 0;
    std::uint16_t samples = 1;
    TIFFGetField(tiff.get(), TIFFTAG_IMAGEWIDTH, &frame.width);
    TIFFGetField(tiff.get(), TIFFTAG_IMAGELENGTH, &frame.height);
    TIFFGetFieldDefaulted(tiff.get(), TIFFTAG_BITSPERSAMPLE, &bits);
    TIFFGetFieldDefaulted(tiff.get(), TIFFTAG_SAMPLESPERPIXEL, &samples);
    if (bits != 16 || samples != 1 || TIFFIsTiled(tiff.get())) {
      throw std::runtime_error(path + ": found " + std::to_string(samples) + " samples of " +
                               std::to_string(bits) + " bits, expected one sample of 16 bits in strips");
    }
    frame.pixels.resize(std::size_t{frame.width} * frame.height);
    auto* at = reinterpret_cast<std::uint8_t*>(frame.pixels.data());
    tmsize_t left = static_cast<tmsize_t>(frame.pixels.size() * sizeof(std::uint16_t));
    for (std::uint32_t strip = 0; strip < TIFFNumberOfStrips(tiff.get()); ++strip) {
      const tmsize_t bytes = TIFFReadEncodedStrip(tiff.get(), strip, at, left);
      if (bytes < 0) throw std::runtime_error(path + ": strip " + std::to_string(strip) + " cannot be read");
      at += bytes;
      left -= bytes;
    }
    if (left != 0)
      throw std::runtime_error(path + ": the last " + std::to_string(left) + " bytes of a frame are missing");
    take(frame);
  } while (TIFFReadDirectory(tiff.get()) == 1);
}
