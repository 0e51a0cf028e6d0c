#include <sys/resource.h>
#include <sys/stat.h>

#include <chrono>

#include "file_parts.h"

using namespace evenfield;

namespace {

/// The refusal of `bytes`, which must name the file.
std::string refusal(const TestFolder& folder, const Bytes& bytes) {
  write_bytes(folder / "bad.file", bytes);
  const std::string why = why_unreadable(folder / "bad.file");
  if (!why.empty()) CHECK(why.find("bad.file") != std::string::npos);
  CHECK(why.find('\n') == std::string::npos);
  return why;
}

bool has(const std::string& text, const std::string& part) { return text.find(part) != std::string::npos; }

struct Kind {
  const char* name;
  WriteOptions options;
};

const Kind kKinds[] = {
    {"TIFF", {}},
    {"TIFF strips", {.big_endian = true, .rows_per_strip = 3}},
    {"TIFF tiles", {.tile_size = 16}},
    {"TIFF deflate", {.compression = WriteCompression::deflate, .rows_per_strip = 5}},
    {"TIFF LZW tiles", {.compression = WriteCompression::lzw, .big_tiff = true, .tile_size = 16}},
    {"TIFF PackBits", {.compression = WriteCompression::packbits}},
    {"FITS cube", {.format = WriteFormat::fits}},
    {"FITS extensions", {.format = WriteFormat::fits, .extensions = true}},
    {"FITS Rice", {.format = WriteFormat::fits, .compression = WriteCompression::rice, .extensions = true}},
    {"FITS gzip tiles", {.format = WriteFormat::fits, .compression = WriteCompression::gzip}},
};

}  // namespace

TEST_CASE("a file cut off anywhere is refused, or whole in all that it still has to hold") {
  const TestFolder folder;
  const FrameShape shape{20, 18, PixelType::u16};
  const auto stack = made_up_stack(shape, 3);
  for (const Kind& kind : kKinds) {
    CAPTURE(std::string(kind.name));
    const bool fits = kind.options.format == WriteFormat::fits;
    REQUIRE(write_stack(folder / "whole", shape, stack, kind.options));
    const Bytes whole = read_bytes(folder / "whole");
    REQUIRE(why_unreadable(folder / "whole").empty());
    const std::size_t step = fits ? 61 : 1;
    for (const bool packed : {false, true}) {
      if (packed && !fits) continue;
      const Bytes full = packed ? gzipped(whole) : whole;
      for (std::size_t length = 0; length < full.size(); length += step) {
        CAPTURE(length);
        write_bytes(folder / "cut", {full.begin(), full.begin() + static_cast<std::ptrdiff_t>(length)});
        const auto file = inspect(folder / "cut");
        const auto frames = file ? decode_all(*file) : Result<std::vector<Bytes>>(file.error());
        if (frames) {
          // Only FITS can end early: between two parts, or in the padding of the last. No frame may be wrong
          // then.
          CHECK(fits);
          CHECK(frames->size() <= stack.size());
          CHECK(std::equal(frames->begin(), frames->end(), stack.begin()));
          continue;
        }
        CHECK(has(to_line(frames.error()), "cut"));
      }
    }
  }
}

TEST_CASE("a cut off TIFF strip or FITS image says how many bytes there are and how many there should be") {
  const TestFolder folder;
  Bytes tiff = SmallTiff{}.set(273, 4, 200).bytes();
  const auto size = std::to_string(tiff.size());
  CHECK(has(refusal(folder, tiff),
            "page 1, StripOffsets: found " + size + " bytes in the file, expected at least 216"));
  const Bytes fits = joined(fits_header(image_cards(16, {"100", "100"})), Bytes(5000));
  CHECK(has(refusal(folder, fits), "page 1, NAXIS: found 7880 bytes, expected at least 22880"));
}

TEST_CASE("bytes changed anywhere never crash a reader") {
  const TestFolder folder;
  const FrameShape shape{20, 18, PixelType::u16};
  const auto stack = made_up_stack(shape, 2);
  std::uint64_t state = 1;
  const auto next = [&state] { return (state = state * 6364136223846793005U + 1442695040888963407U) >> 33U; };
  int refused = 0;
  int tried = 0;
  for (const Kind& kind : kKinds) {
    CAPTURE(std::string(kind.name));
    REQUIRE(write_stack(folder / "whole", shape, stack, kind.options));
    const Bytes whole = read_bytes(folder / "whole");
    for (int round = 0; round < 150; ++round, ++tried) {
      Bytes bytes = whole;
      for (std::uint64_t change = 0; change < 1 + next() % 4; ++change) {
        // Half of the changes hit the last or the first 400 bytes, where directories and headers are.
        const std::uint64_t near = next() % 400;
        const std::uint64_t place[] = {next(), near, bytes.size() - 1 - near, next()};
        bytes[static_cast<std::size_t>(place[next() % 4] % bytes.size())] = static_cast<char>(next());
      }
      CAPTURE(round);
      if (!refusal(folder, bytes).empty()) ++refused;
    }
  }
  // Most changes of pixels go unnoticed by design of the formats; the headers are watched.
  CHECK(refused > tried / 10);
}

TEST_CASE("what TIFF pages we do not read is refused with tag, found and expected") {
  const TestFolder folder;
  const auto with = [&](unsigned tag, std::uint32_t value) {
    return refusal(folder, SmallTiff{}.set(tag, 4, value).bytes());
  };
  CHECK(refusal(folder, SmallTiff{}.bytes()).empty());
  CHECK(has(with(277, 3), "page 1, SamplesPerPixel: found 3, expected 1"));
  CHECK(has(with(258, 12), "page 1, BitsPerSample: found 12, expected 8, 16 or 32"));
  CHECK(has(with(259, 7), "page 1, Compression: found 7, expected"));
  CHECK(has(with(262, 0), "page 1, PhotometricInterpretation: found 0 (white is zero), expected 1"));
  CHECK(has(with(262, 32803), "page 1, PhotometricInterpretation: found 32803, expected 1"));
  CHECK(has(with(266, 2), "page 1, FillOrder: found 2, expected 1"));
  CHECK(has(with(339, 3), "page 1, BitsPerSample: found 16 of a float, expected 32 or 64"));
  CHECK(has(with(339, 6), "page 1, SampleFormat: found 6, expected"));
  CHECK(has(with(256, 2000000), "found a frame of 2000000 x 2, expected 1 to 1000000 a side"));
  CHECK(has(with(279, 12), "page 1, StripByteCounts: found"));
  CHECK(has(with(279, 20), "page 1, StripByteCounts: found 20 bytes for strip 1, expected 16"));
  CHECK(has(with(273, 4000000000U), "page 1, StripOffsets: found"));
  CHECK(has(refusal(folder, SmallTiff{}.remove(279).bytes()), "StripByteCounts"));
  SmallTiff huge;
  huge.set(256, 4, 60000).set(257, 4, 60000).set(278, 4, 60000);
  CHECK(has(refusal(folder, huge.bytes()), "expected at most 2147483648 pixels"));
  // 16 bytes of deflate cannot hold 20000 x 20000 pixels.
  huge.set(256, 4, 20000).set(257, 4, 20000).set(278, 4, 20000).set(259, 3, 8);
  CHECK(
      has(refusal(folder, huge.bytes()), "found 16 bytes in all, expected enough for 20000 x 20000 pixels"));
  SmallTiff loop;
  loop.next_directory = 24;
  CHECK(has(refusal(folder, loop.bytes()), "page 2"));
  SmallTiff lost;
  lost.next_directory = 100000;
  CHECK(has(refusal(folder, lost.bytes()), "page 2"));
  CHECK(has(refusal(folder, SmallTiff{}.set(254, 4, 1).bytes()), "found thumbnails only"));
}

TEST_CASE("what FITS files we do not read is refused with keyword, found and expected") {
  const TestFolder folder;
  const Bytes data = padded(Bytes(64));
  const auto of = [&](int bits, const std::vector<std::string>& axes,
                      const std::vector<std::string>& more = {}) {
    return refusal(folder, joined(fits_header(image_cards(bits, axes, more)), data));
  };
  CHECK(of(16, {"4", "4"}).empty());
  CHECK(has(of(64, {"2", "2"}), "page 1, BITPIX: found 64, expected"));
  CHECK(has(of(12, {"2", "2"}), "page 1, BITPIX: found 12, expected"));
  CHECK(has(of(16, {"4"}), "page 1, NAXIS: found 1, expected 2 or more"));
  CHECK(has(of(16, {"-4", "4"}), "page 1, NAXIS1: found -4"));
  CHECK(has(of(16, {"four", "4"}), "page 1, NAXIS1: found 'four', expected a whole number"));
  CHECK(has(of(16, {"4", "4"}, {"BSCALE  = 0.0"}), "page 1, BSCALE: found 0"));
  CHECK(has(of(16, {"4", "4"}, {"BZERO   = 'no'"}), "page 1, BZERO"));
  CHECK(has(of(16, {"0", "4"}, {"GROUPS  =                    T"}), "page 1, GROUPS: found T"));
  CHECK(has(of(16, {"9000000000000000000", "9000000000000000000"}), "NAXIS2: found"));
  CHECK(has(of(16, {"0", "4"}), "found no image with pixels"));
  // Undefined pixels are looked for where BLANK says how they are marked.
  CHECK(has(of(16, {"4", "4"}, {"BLANK   = 0"}), "page 1, BLANK: found undefined pixels"));
  CHECK(has(of(16, {"4", "4"}, {"BLANK   = 0", "BZERO   = 32768"}), "page 1, BLANK: found undefined pixels"));
  CHECK(has(of(16, {"4", "4"}, {"BLANK   = 0", "BSCALE  = 2.0"}), "page 1, BLANK: found undefined pixels"));
  CHECK(of(16, {"4", "4"}, {"BLANK   = 7"}).empty());
  const Bytes whole = joined(fits_header(image_cards(16, {"4", "4"})), data);
  CHECK(has(refusal(folder, joined(whole, Bytes(2880, 'x'))), "page 2, XTENSION: found other bytes behind"));
  CHECK(refusal(folder, joined(whole, Bytes(2880))).empty());
  CHECK(has(refusal(folder, Bytes{}), "found an empty file"));
  CHECK(has(refusal(folder, Bytes{'P', '5', ' ', '1'}),
            "found a file that begins with 50 35 20 31, expected TIFF or FITS"));
}

TEST_CASE("packed files that are damaged, hold no FITS or grow beyond their header are refused") {
  const TestFolder folder;
  const Bytes frame = joined(fits_header(image_cards(16, {"50", "50"})), padded(made_up_frame({50, 50}, 1)));
  Bytes packed = gzipped(frame);
  packed[packed.size() / 2] = static_cast<char>(packed[packed.size() / 2] ^ 0x10);
  CHECK(has(refusal(folder, packed), "gzip data"));
  CHECK(has(refusal(folder, gzipped(SmallTiff{}.bytes())),
            "found a TIFF file packed with gzip, expected FITS"));
  CHECK(has(refusal(folder, gzipped(Bytes(10000, 'x'))), "expected SIMPLE as its first keyword"));
  CHECK(has(refusal(folder, gzipped(Bytes{})), "found no FITS header"));
  const Bytes empty_header = fits_header(image_cards(16, {"40000", "40000"}));
  CHECK(has(refusal(folder, gzipped(empty_header)), "packed bytes, which unpack to at most"));
}

TEST_CASE("a gzip bomb is refused at once and with little memory") {
  // 2 GB of zeros: behind a small frame, behind a header that never ends, and in place of a header.
  const TestFolder folder;
  const Bytes megabyte(1U << 20U);
  Bytes zeros;
  for (int i = 0; i < 2; ++i) zeros = joined(std::move(zeros), gzipped(Bytes(std::size_t{1} << 24U), 9));
  Bytes many;
  for (int i = 0; i < 64; ++i) many = joined(std::move(many), zeros);
  const Bytes frame = joined(fits_header(image_cards(16, {"50", "50"})), padded(Bytes(5000)));
  Bytes endless(2880 * 10, ' ');
  const std::string first = "SIMPLE  =                    T";
  std::copy(first.begin(), first.end(), endless.begin());
  for (const Bytes& start : {frame, endless, Bytes{}}) {
    rusage before{};
    getrusage(RUSAGE_SELF, &before);
    const auto begin = std::chrono::steady_clock::now();
    CHECK_FALSE(refusal(folder, joined(gzipped(start), many)).empty());
    const std::chrono::duration<double> took = std::chrono::steady_clock::now() - begin;
    rusage after{};
    getrusage(RUSAGE_SELF, &after);
    CHECK(took.count() < 2.0);
    CHECK(after.ru_maxrss - before.ru_maxrss < 50000);  // kB
  }
}

TEST_CASE("folders, pipes and absent files are refused by name") {
  const TestFolder folder;
  const auto line_of = [](const std::filesystem::path& path) {
    const auto file = inspect(path);
    REQUIRE_FALSE(file);
    CHECK(file.error().code == Errc::input);
    return to_line(file.error());
  };
  CHECK(line_of(folder.path()) == folder.path().string() + ": found a folder, expected a file");
  CHECK(line_of(folder / "none.tif") == (folder / "none.tif").string() + ": not found");
  REQUIRE(::mkfifo((folder / "pipe").c_str(), 0600) == 0);
  CHECK(line_of(folder / "pipe") == (folder / "pipe").string() + ": found a device or pipe, expected a file");
}

TEST_CASE("a file that changes after it was inspected gives an error and no crash") {
  const TestFolder folder;
  const FrameShape shape{20, 18, PixelType::u16};
  const FrameShape other{40, 36, PixelType::u16};
  const auto path = folder / "a";
  for (const Kind& before : kKinds) {
    CAPTURE(std::string(before.name));
    const auto stack = made_up_stack(shape, 3);
    REQUIRE(write_stack(path, shape, stack, before.options));
    const auto file = inspect(path);
    REQUIRE(file);
    // Cut off under an open decoder, and before it is opened.
    auto decoder = open_decoder(*file);
    REQUIRE(decoder);
    std::filesystem::resize_file(path, 100);
    Bytes frame(frame_bytes(shape));
    // CFITSIO may hold the bytes of a small file already; then the frame is right.
    if ((*decoder)->decode(3, frame.data())) CHECK((frame == stack[2]));
    CHECK_FALSE(decode_all(*file));
    // Another file under the same name, with frames of another size.
    for (const Kind& after : kKinds) {
      CAPTURE(std::string(after.name));
      REQUIRE(write_stack(path, other, made_up_stack(other, 1), after.options));
      const auto frames = decode_all(*file);
      // Extents of the old file may lie inside the new one; then bytes are read that mean nothing, but are
      // there.
      if (!file->pages[0].extents.empty()) continue;
      CHECK_FALSE(frames);
    }
  }
}
