#include "file_parts.h"

using namespace evenfield;

// Files written out by hand after the standards, so that a mistake made by reader and writer alike is caught.

namespace {

template <class Pixel>
std::vector<Pixel> pixels_of(const std::filesystem::path& path, int page = 1) {
  const auto file = inspect(path);
  REQUIRE_MESSAGE(file, to_line(file.error()));
  const auto frames = decode_all(*file);
  REQUIRE_MESSAGE(frames, to_line(frames.error()));
  const Bytes& frame = (*frames)[static_cast<std::size_t>(page - 1)];
  std::vector<Pixel> pixels(frame.size() / sizeof(Pixel));
  std::memcpy(pixels.data(), frame.data(), frame.size());
  return pixels;
}

}  // namespace

TEST_CASE("a little-endian TIFF made by hand reads as the numbers in it") {
  const TestFolder folder;
  write_bytes(folder / "a.tif", SmallTiff{}.bytes());
  CHECK(pixels_of<std::uint16_t>(folder / "a.tif") ==
        std::vector<std::uint16_t>{1, 2, 3, 4, 256, 512, 768, 1024});
  write_bytes(folder / "b.tif", SmallTiff{}.set(339, 3, 2).bytes());  // SampleFormat 2: signed
  const auto file = inspect(folder / "b.tif");
  REQUIRE(file);
  CHECK(file->pages[0].shape == FrameShape{4, 2, PixelType::i16});
}

TEST_CASE("a big-endian BigTIFF made by hand reads as the numbers in it") {
  // Version 43, offsets of 8 bytes, directory: count of 8 bytes, entries of 20, next offset of 8.
  Bytes bytes{'M', 'M', 0, 43, 0, 8, 0, 0};
  put(bytes, 20, 8, true);
  bytes.insert(bytes.end(), {0x01, 0x02, '\xFF', '\xFE'});  // pixels at byte 16: 258 and 65534
  const std::pair<unsigned, std::uint32_t> tags[] = {{256, 2},  {257, 1}, {258, 16}, {259, 1}, {262, 1},
                                                     {273, 16}, {277, 1}, {278, 1},  {279, 4}};
  put(bytes, 9, 8, true);
  for (const auto& [tag, value] : tags) {
    put(bytes, tag, 2, true);
    put(bytes, 4, 2, true);
    put(bytes, 1, 8, true);
    put(bytes, value, 4, true);
    put(bytes, 0, 4, true);
  }
  put(bytes, 0, 8, true);
  const TestFolder folder;
  write_bytes(folder / "a.tif", bytes);
  CHECK(pixels_of<std::uint16_t>(folder / "a.tif") == std::vector<std::uint16_t>{258, 65534});
  const auto file = inspect(folder / "a.tif");
  REQUIRE(file->pages[0].extents.size() == 1);
  CHECK(file->pages[0].extents[0].offset == 16);
  CHECK(file->pages[0].encoding.swap_bytes);
}

TEST_CASE("a TIFF page of the writer holds the bytes that the standard asks for") {
  const TestFolder folder;
  const FrameShape shape{4, 2, PixelType::u16};
  const Bytes frame{1, 0, 2, 0, 3, 0, 4, 0, 0, 1, 0, 2, 0, 3, 0, 4};
  REQUIRE(write_stack(folder / "a.tif", shape, {frame}, WriteOptions{}));
  const Bytes little = read_bytes(folder / "a.tif");
  CHECK((Bytes(little.begin(), little.begin() + 4) == Bytes{'I', 'I', 42, 0}));
  CHECK(std::search(little.begin(), little.end(), frame.begin(), frame.end()) != little.end());
  REQUIRE(write_stack(folder / "b.tif", shape, {frame}, WriteOptions{.big_endian = true}));
  const Bytes big = read_bytes(folder / "b.tif");
  CHECK((Bytes(big.begin(), big.begin() + 4) == Bytes{'M', 'M', 0, 42}));
  const Bytes swapped{0, 1, 0, 2, 0, 3, 0, 4, 1, 0, 2, 0, 3, 0, 4, 0};
  CHECK(std::search(big.begin(), big.end(), swapped.begin(), swapped.end()) != big.end());
}

TEST_CASE("a FITS file made by hand reads as the numbers in it, scaled or not") {
  const TestFolder folder;
  const auto path = folder / "a.fits";
  const Bytes data =
      padded({0x01, 0x02, '\xFF', '\xFF', '\x80', 0x00, 0x7F, '\xFF'});  // 258, -1, -32768, 32767
  write_bytes(path, joined(fits_header(image_cards(16, {"2", "2"})), data));
  CHECK(pixels_of<std::int16_t>(path) == std::vector<std::int16_t>{258, -1, -32768, 32767});
  // FITS Standard 4.0, section 5.2.5: BZERO 32768 makes the same bits unsigned.
  write_bytes(path,
              joined(fits_header(image_cards(16, {"2", "2"}, {"BZERO   = 32768", "BSCALE  = 1.0"})), data));
  CHECK(pixels_of<std::uint16_t>(path) == std::vector<std::uint16_t>{33026, 32767, 0, 65535});
  write_bytes(path,
              joined(fits_header(image_cards(16, {"2", "2"}, {"BZERO   = 10.5", "BSCALE  = -2.0"})), data));
  CHECK(pixels_of<double>(path) == std::vector<double>{-505.5, 12.5, 65546.5, -65523.5});
  write_bytes(path, joined(fits_header(image_cards(8, {"4", "2"}, {"BZERO   = -128."})), data));
  CHECK(pixels_of<std::int8_t>(path) == std::vector<std::int8_t>{-127, -126, 127, 127, 0, -128, -1, 127});
  write_bytes(path, joined(fits_header(image_cards(32, {"2", "1"}, {"BZERO   = 2147483648"})), data));
  CHECK(pixels_of<std::uint32_t>(path) == std::vector<std::uint32_t>{0x8102FFFF, 0x00007FFF});
  const Bytes one_and_half = padded({0x3F, '\x80', 0, 0, '\xBF', 0, 0, 0});  // IEEE 754: 1 and -0.5
  write_bytes(path, joined(fits_header(image_cards(-32, {"2", "1"})), one_and_half));
  CHECK(pixels_of<float>(path) == std::vector<float>{1.0F, -0.5F});
  write_bytes(path, joined(fits_header(image_cards(-32, {"2", "1"}, {"BZERO   = 100.", "BSCALE  = 2."})),
                           one_and_half));
  CHECK(pixels_of<double>(path) == std::vector<double>{102.0, 99.0});
}

TEST_CASE(
    "higher axes of a FITS file count plane by plane, the last padding may lack, and empty parts are no "
    "frames") {
  const TestFolder folder;
  const auto path = folder / "a.fits";
  const Bytes data{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12};
  write_bytes(path, joined(fits_header(image_cards(8, {"2", "1", "2", "3"})), data));
  for (int page = 1; page <= 6; ++page) {
    const auto first = static_cast<std::uint8_t>(2 * page - 1);
    CHECK(pixels_of<std::uint8_t>(path, page) ==
          std::vector<std::uint8_t>{first, static_cast<std::uint8_t>(first + 1)});
  }
  const Bytes table =
      joined(fits_header({"XTENSION= 'BINTABLE'", "BITPIX  = 8", "NAXIS   = 2", "NAXIS1  = 4", "NAXIS2  = 1",
                          "PCOUNT  = 0", "GCOUNT  = 1", "TFIELDS = 1", "TFORM1  = '1J      '"}),
             padded({1, 2, 3, 4}));
  const Bytes image = joined(fits_header({"XTENSION= 'IMAGE   '", "BITPIX  = 8", "NAXIS   = 2", "NAXIS1  = 3",
                                          "NAXIS2  = 1", "PCOUNT  = 0", "GCOUNT  = 1"}),
                             padded({7, 8, 9}));
  const Bytes primary = fits_header(image_cards(8, {}, {"DATE-OBS= '2026-11-24T09:30:00'"}));
  write_bytes(path, joined(joined(primary, table), image));
  const auto file = inspect(path);
  REQUIRE_MESSAGE(file, to_line(file.error()));
  REQUIRE(file->pages.size() == 1);
  CHECK(file->header.acquired.value_or("") == "2026-11-24T09:30:00Z");
  CHECK(pixels_of<std::uint8_t>(path) == std::vector<std::uint8_t>{7, 8, 9});
}

TEST_CASE("a FITS frame of the writer holds the bytes that the standard asks for") {
  const TestFolder folder;
  const FrameShape shape{2, 1, PixelType::u16};
  REQUIRE(write_stack(folder / "a.fits", shape, {Bytes{0x34, 0x12, '\xFF', '\xFF'}},
                      WriteOptions{.format = WriteFormat::fits}));
  const Bytes bytes = read_bytes(folder / "a.fits");
  REQUIRE(bytes.size() == 5760);
  const std::string text(bytes.begin(), bytes.begin() + 2880);
  for (const char* card :
       {"SIMPLE  =                    T", "BITPIX  =                   16", "NAXIS   =                    2",
        "NAXIS1  =                    2", "NAXIS2  =                    1", "BZERO   =                32768",
        "BSCALE  =                    1"}) {
    CAPTURE(std::string(card));
    const std::size_t at = text.find(card);
    CHECK(at != std::string::npos);
    CHECK(at % 80 == 0);
  }
  // 0x1234 and 0xFFFF less 32768, high byte first.
  CHECK((Bytes(bytes.begin() + 2880, bytes.begin() + 2884) == Bytes{'\x92', 0x34, 0x7F, '\xFF'}));
}

TEST_CASE("a packed FITS file reads like the file in it, in one gzip member or several") {
  const TestFolder folder;
  const FrameShape shape{60, 50, PixelType::u16};
  const auto stack = made_up_stack(shape, 4);
  for (const auto compression : {WriteCompression::none, WriteCompression::rice}) {
    WriteOptions options{.format = WriteFormat::fits, .compression = compression, .extensions = true};
    REQUIRE(write_stack(folder / "a.fits", shape, stack, options));
    const Bytes plain = read_bytes(folder / "a.fits");
    const auto middle = plain.begin() + static_cast<std::ptrdiff_t>(plain.size() / 2);
    const Bytes two = joined(gzipped({plain.begin(), middle}), gzipped({middle, plain.end()}));
    for (const Bytes& packed : {gzipped(plain), two}) {
      write_bytes(folder / "any.name", packed);
      const auto file = inspect(folder / "any.name");
      REQUIRE_MESSAGE(file, to_line(file.error()));
      REQUIRE(file->pages.size() == 4);
      CHECK(file->pages[0].extents.empty());
      const auto frames = decode_all(*file);
      REQUIRE_MESSAGE(frames, to_line(frames.error()));
      CHECK((*frames == stack));
    }
  }
}
