#include <chrono>

#include "file_parts.h"

using namespace evenfield;

namespace {

/// A TIFF file of `pages` pages of 4 x 2 pixels of 16 bit, put together by hand: a writer might be slow
/// itself.
Bytes many_pages(int pages) {
  Bytes bytes{'I', 'I', 42, 0};
  put(bytes, 8 + 16, 4);
  for (int page = 0; page < pages; ++page) {
    const auto start = static_cast<std::uint32_t>(bytes.size());
    for (unsigned pixel = 0; pixel < 8; ++pixel) put(bytes, static_cast<unsigned>(page % 60000) + pixel, 2);
    SmallTiff one;
    one.set(273, 4, start);
    put(bytes, one.tags.size(), 2);
    for (const TiffTag& tag : one.tags) {
      put(bytes, tag.tag, 2);
      put(bytes, tag.type, 2);
      put(bytes, 1, 4);
      put(bytes, tag.value, 4);
    }
    // The next directory lies behind this offset and the next page's 16 bytes.
    put(bytes, page + 1 < pages ? bytes.size() + 4 + 16 : 0, 4);
  }
  return bytes;
}

double seconds_to_inspect(const std::filesystem::path& path, std::size_t pages) {
  const auto begin = std::chrono::steady_clock::now();
  const auto file = inspect(path);
  const std::chrono::duration<double> took = std::chrono::steady_clock::now() - begin;
  REQUIRE_MESSAGE(file, to_line(file.error()));
  CHECK(file->pages.size() == pages);
  return took.count();
}

}  // namespace

TEST_CASE("the time to inspect a TIFF stack grows with its pages, not with their square") {
  const TestFolder folder;
  write_bytes(folder / "few.tif", many_pages(2000));
  write_bytes(folder / "many.tif", many_pages(20000));
  const double few = seconds_to_inspect(folder / "few.tif", 2000);
  const double many = seconds_to_inspect(folder / "many.tif", 20000);
  // Ten times the pages: ten times the time if linear, a hundred times if not. The constant allows for a busy
  // machine.
  CHECK(many < 35.0 * few + 0.2);
  const auto file = inspect(folder / "many.tif");
  REQUIRE(file);
  auto decoder = open_decoder(*file);
  REQUIRE(decoder);
  std::uint16_t pixels[8];
  REQUIRE((*decoder)->decode(20000, pixels));
  CHECK(pixels[0] == 19999);
  CHECK(pixels[7] == 20006);
}

TEST_CASE("the frames of an ImageJ stack that lie behind its only page are counted") {
  // Its description is the only place that tells of them.
  const TestFolder folder;
  const std::string text("ImageJ=1.53t\nimages=3\nslices=3\nloop=false\n\0", 44);
  SmallTiff one;
  for (unsigned char pixel = 10; pixel < 42; ++pixel) one.pixels.push_back(static_cast<char>(pixel));
  const auto description = 8 + static_cast<std::uint32_t>(one.pixels.size());
  one.pixels.insert(one.pixels.end(), text.begin(), text.end());
  one.set(270, 2, description);
  Bytes bytes = one.bytes();
  // The count of the description's entry: the number of its characters. Entries start 2 bytes into the
  // directory.
  const auto entry =
      std::find_if(one.tags.begin(), one.tags.end(), [](const TiffTag& tag) { return tag.tag == 270; });
  const auto at = 8 + one.pixels.size() + 2 + 12 * static_cast<std::size_t>(entry - one.tags.begin()) + 4;
  bytes[at] = static_cast<char>(text.size());
  write_bytes(folder / "stack.tif", bytes);
  const auto file = inspect(folder / "stack.tif");
  REQUIRE_MESSAGE(file, to_line(file.error()));
  REQUIRE(file->pages.size() == 3);
  const auto frames = decode_all(*file);
  REQUIRE(frames);
  for (std::size_t page = 0; page < 3; ++page) {
    CHECK(std::equal((*frames)[page].begin(), (*frames)[page].end(),
                     bytes.begin() + static_cast<std::ptrdiff_t>(8 + 16 * page)));
  }
  const std::string more = "images=3000\n";
  const std::size_t images = std::string(bytes.begin(), bytes.end()).find("images=3");
  std::copy(more.begin(), more.end(), bytes.begin() + static_cast<std::ptrdiff_t>(images));
  write_bytes(folder / "short.tif", bytes);
  CHECK(why_unreadable(folder / "short.tif").find("ImageDescription: found images=3000") !=
        std::string::npos);
}

TEST_CASE("thumbnails between the pages of a TIFF stack are skipped, and the frames keep their order") {
  const TestFolder folder;
  Bytes bytes{'I', 'I', 42, 0};
  put(bytes, 8 + 16, 4);
  for (unsigned page = 0; page < 4; ++page) {
    const auto start = static_cast<std::uint32_t>(bytes.size());
    // PackBits, TIFF 6.0 section 9: 241 repeats the next byte 16 times; the rest of the 16 bytes is not used.
    bytes.insert(bytes.end(), {'\xF1', static_cast<char>(page + 1)});
    bytes.resize(bytes.size() + 14);
    SmallTiff one;
    one.set(254, 4, page % 2).set(259, 3, 32773).set(273, 4, start).set(279, 4, 2);
    put(bytes, one.tags.size(), 2);
    for (const TiffTag& tag : one.tags) {
      put(bytes, tag.tag, 2);
      put(bytes, tag.type, 2);
      put(bytes, 1, 4);
      put(bytes, tag.value, 4);
    }
    put(bytes, page < 3 ? bytes.size() + 4 + 16 : 0, 4);
  }
  write_bytes(folder / "a.tif", bytes);
  const auto file = inspect(folder / "a.tif");
  REQUIRE_MESSAGE(file, to_line(file.error()));
  REQUIRE(file->pages.size() == 2);
  auto decoder = open_decoder(*file);
  REQUIRE(decoder);
  Bytes frame(16);
  for (const int page : {2, 1, 2}) {
    const Status status = (*decoder)->decode(page, frame.data());
    REQUIRE_MESSAGE(status, to_line(status.error()));
    CHECK((frame == Bytes(16, static_cast<char>(2 * page - 1))));
  }
}
