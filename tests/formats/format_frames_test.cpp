#include "frames_on_disk.h"

using namespace evenfield;

namespace {

const std::filesystem::path kFolder = std::filesystem::path(EVENFIELD_SOURCE_DIR) / "../shared/format_frames";

bool absent() {
  if (std::filesystem::is_directory(kFolder)) return false;
  MESSAGE("no collection of frames in odd formats here");
  return true;
}

/// Statistics of the first frame as tifffile 2023.2.3 and astropy 5.2.1 decode it.
struct Row {
  const char* name;
  std::size_t pages;
  FrameShape shape;
  double mean, low, high;
};

constexpr Row kRows[] = {
    {"tiff/CZT_peaks.ome.tif", 16, {56, 48, PixelType::u16}, 149.019, 85, 331},
    {"tiff/Stack-1.tif", 5, {165, 172, PixelType::u8}, 2.40532, 0, 255},
    {"tiff/chessboard_GRAY_U16.tif", 1, {200, 200, PixelType::u16}, 127.5, 0, 255},
    {"tiff/chessboard_GRAY_U16B.tif", 1, {200, 200, PixelType::u16}, 127.5, 0, 255},
    {"tiff/gradient-1c-32b.tiff", 1, {256, 1, PixelType::u32}, 2.14802e9, 3.83767e6, 4.28752e9},
    {"tiff/gradient-1c-64b-float.tiff", 1, {256, 1, PixelType::f64}, 0.500125, 0.000893528, 0.998265},
    {"tiff/grey16-multi.tif", 2, {30, 90, PixelType::u16}, 53225.1, 0, 65535},
    {"tiff/grey16.tif", 1, {30, 90, PixelType::u16}, 53225.1, 0, 65535},
    {"tiff/int16.tif", 1, {64, 64, PixelType::i16}, 86.5225, -5000, 4998},
    {"tiff/minisblack-1c-16b.tiff", 1, {157, 151, PixelType::u16}, 30924.5, 0, 58955},
    {"tiff/minisblack-1c-i16b.tiff", 1, {157, 151, PixelType::i16}, -1843.46, -32767, 26186},
    {"tiff/multipage.tif", 2, {10, 15, PixelType::u8}, 127.5, 0, 255},
    {"tiff/seq-1c-16b-bigendian-68f373a0.tiff", 1, {16, 16, PixelType::u16}, 127.5, 0, 255},
    {"tiff/seq-1c-16b-deflate-68f373a0.tiff", 1, {16, 16, PixelType::u16}, 127.5, 0, 255},
    // The same 256 numbers as its neighbours, by their common name; tifffile has no LZW here.
    {"tiff/seq-1c-16b-lzw-68f373a0.tiff", 1, {16, 16, PixelType::u16}, 127.5, 0, 255},
    {"tiff/seq-1c-16b-multistrip-68f373a0.tiff", 1, {16, 16, PixelType::u16}, 127.5, 0, 255},
    {"tiff/seq-1c-16b-tiled-68f373a0.tiff", 1, {16, 16, PixelType::u16}, 127.5, 0, 255},
    {"tiff/seq-1c-32f-390fe673.tiff", 1, {16, 16, PixelType::f32}, 0.5, 0, 1},
    {"tiff/seq-1c-8b-multipage-adeefdcc.tiff", 3, {16, 16, PixelType::u8}, 127.5, 0, 255},
    {"tiff/seq-1c-8b-packbits-20f3db0c.tiff", 1, {16, 16, PixelType::u8}, 127.5, 0, 255},
    {"tiff/seq-1c-i16-63af2488.tiff", 1, {16, 16, PixelType::i16}, -0.5, -128, 127},
    {"fits/a8280271.fits", 1, {536, 520, PixelType::u16}, 296, 187, 1715},
    {"fits/checksum.fits", 1, {30, 40, PixelType::i16}, 209.58, 4, 342},
    {"fits/comp.fits", 1, {440, 300, PixelType::i16}, 260.741, 0, 1037},
    {"fits/compressed_image.fits", 1, {10, 10, PixelType::i16}, 49.5, 0, 99},
    {"fits/double_ext.fits", 1, {5, 5, PixelType::u16}, 0, 0, 0},
    {"fits/flat-mef.fits", 3, {10, 10, PixelType::f32}, 1, 1, 1},
    {"fits/m13.fits", 1, {300, 300, PixelType::i16}, 147.704, 109, 3618},
    {"fits/m13_gzip.fits", 1, {300, 300, PixelType::i16}, 147.704, 109, 3618},
    {"fits/m13_rice.fits", 1, {300, 300, PixelType::i16}, 147.704, 109, 3618},
    {"fits/o4sp040b0_raw.fits", 2, {62, 44, PixelType::u16}, 1508.47, 1487, 1515},
    {"fits/scale.fits", 1, {20, 21, PixelType::f64}, 531.435, 491.882, 2726.62},
    {"fits/solved.fits.fz", 1, {700, 700, PixelType::u16}, 2236.82, 2033, 13863},
    {"fits/test0.fits", 4, {40, 40, PixelType::i16}, 313.138, 309, 474},
};

}  // namespace

TEST_CASE("frames of other people's programs have the size, type and statistics that other readers find") {
  if (absent()) return;
  for (const Row& row : kRows) {
    CAPTURE(std::string(row.name));
    const auto file = inspect(kFolder / row.name);
    REQUIRE_MESSAGE(file, to_line(file.error()));
    CHECK(file->pages.size() == row.pages);
    CHECK(file->pages[0].shape == row.shape);
    const auto frames = decode_all(*file);
    REQUIRE_MESSAGE(frames, to_line(frames.error()));
    const FrameStatistics found = statistics_of((*frames)[0], row.shape.type);
    // The expected values are printed to six digits.
    CHECK(found.mean == doctest::Approx(row.mean).epsilon(1e-5));
    CHECK(found.low == doctest::Approx(row.low).epsilon(1e-5));
    CHECK(found.high == doctest::Approx(row.high).epsilon(1e-5));
  }
}

TEST_CASE("a pixel that a compressed float image leaves undefined is not a number") {
  if (absent()) return;
  const auto file = inspect(kFolder / "fits/compressed_with_nan.fits");
  REQUIRE_MESSAGE(file, to_line(file.error()));
  const auto frames = decode_all(*file);
  REQUIRE_MESSAGE(frames, to_line(frames.error()));
  std::vector<double> pixels(144);
  std::memcpy(pixels.data(), (*frames)[0].data(), (*frames)[0].size());
  // The file was made to have one, as its name says; the others lie on a ramp from 0 to 143.
  CHECK(std::count_if(pixels.begin(), pixels.end(), [](double pixel) { return std::isnan(pixel); }) == 1);
}

TEST_CASE("odd and damaged files of other programs are read or refused by name, and none crashes") {
  if (absent()) return;
  int files = 0;
  for (const char* folder : {"tiff", "fits", "corrupt"}) {
    for (const auto& entry : std::filesystem::directory_iterator(kFolder / folder)) {
      ++files;
      const std::string why = why_unreadable(entry.path());
      const bool expected = std::any_of(std::begin(kRows), std::end(kRows),
                                        [&](const Row& row) { return entry.path() == kFolder / row.name; });
      if (expected) CHECK(why == "");
      if (!why.empty()) CHECK(why.find(entry.path().filename().string()) != std::string::npos);
    }
  }
  CHECK(files > 0);
}
