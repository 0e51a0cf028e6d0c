#include "base/parallel.h"
#include "frames_on_disk.h"

using namespace evenfield;

namespace {

struct Layout {
  const char* name;
  int rows_per_strip;
  int tile_size;
};

// 97 x 83 divides by none of these, so that last strips and edge tiles are cut.
constexpr Layout kLayouts[] = {
    {"one strip", 83, 0}, {"strips of 7 rows", 7, 0}, {"default strips", 0, 0}, {"tiles of 32", 0, 32}};

/// Pieces of rows that decode apart, in an order that jumps between frames, are the rows of the frames.
void check_pieces(const FrameFile& file, const std::vector<Bytes>& stack) {
  auto decoder = open_decoder(file);
  REQUIRE(decoder);
  const FrameShape& shape = file.pages[0].shape;
  const std::size_t row_bytes = frame_bytes(shape) / static_cast<std::size_t>(shape.height);
  for (int y = 0; y < shape.height;) {
    const int rows_apart = file.pages[0].rows_apart;
    // One piece, two pieces, or all that are left.
    const int rows = std::min(rows_apart * (y % 2 + 1), shape.height - y);
    for (std::size_t i = 0; i < stack.size(); ++i) {
      Bytes rows_of_piece(row_bytes * static_cast<std::size_t>(rows));
      const Status decoded = (*decoder)->decode_rows(static_cast<int>(i) + 1, y, rows, rows_of_piece.data());
      REQUIRE_MESSAGE(decoded, to_line(decoded.error()));
      REQUIRE(std::memcmp(rows_of_piece.data(), stack[i].data() + row_bytes * static_cast<std::size_t>(y),
                          rows_of_piece.size()) == 0);
    }
    y += rows;
  }
}

/// Writes, reads by the decoder, by extents and by pieces, and expects the same bits from all.
void check_round_trip(const TestFolder& folder, PixelType type, const WriteOptions& options, bool raw) {
  const FrameShape shape{97, 83, type};
  const auto stack = made_up_stack(shape, 3);
  const auto path = folder / "stack";
  const Status written = write_stack(path, shape, stack, options);
  REQUIRE_MESSAGE(written, to_line(written.error()));
  const auto file = inspect(path);
  REQUIRE_MESSAGE(file, to_line(file.error()));
  REQUIRE(file->pages.size() == 3);
  const auto frames = decode_all(*file);
  REQUIRE_MESSAGE(frames, to_line(frames.error()));
  for (std::size_t i = 0; i < stack.size(); ++i) {
    CHECK(file->pages[i].shape == shape);
    CHECK(((*frames)[i] == stack[i]));
    CHECK(file->pages[i].extents.empty() == !raw);
    if (raw) CHECK((read_by_extents(path, file->pages[i]) == stack[i]));
  }
  const bool pieces = options.format == WriteFormat::tiff
                          ? !raw && options.rows_per_strip != shape.height
                          : options.compression == WriteCompression::rice && !is_floating(type);
  CHECK((file->pages[0].rows_apart > 0) == pieces);
  if (pieces) check_pieces(*file, stack);
}

}  // namespace

TEST_CASE("every TIFF type, layout, compression, byte order and size reads back bit for bit") {
  const TestFolder folder;
  for (const PixelType type : kAllTypes) {
    for (const Layout& layout : kLayouts) {
      for (const auto compression : {WriteCompression::none, WriteCompression::deflate, WriteCompression::lzw,
                                     WriteCompression::packbits}) {
        for (const int kind : {0, 1, 2, 3}) {
          WriteOptions options;
          options.compression = compression;
          options.rows_per_strip = layout.rows_per_strip;
          options.tile_size = layout.tile_size;
          options.big_endian = (kind & 1) != 0;
          options.big_tiff = (kind & 2) != 0;
          CAPTURE(std::string(name_of(type)));
          CAPTURE(std::string(layout.name));
          CAPTURE(static_cast<int>(compression));
          CAPTURE(kind);
          check_round_trip(folder, type, options,
                           compression == WriteCompression::none && layout.tile_size == 0);
        }
      }
    }
  }
}

TEST_CASE("every FITS type reads back bit for bit as cube, as extensions, and tile-compressed") {
  const TestFolder folder;
  for (const PixelType type : kAllTypes) {
    for (const auto compression : {WriteCompression::none, WriteCompression::rice, WriteCompression::gzip}) {
      if (compression == WriteCompression::rice && is_floating(type)) continue;
      for (const bool extensions : {false, true}) {
        WriteOptions options;
        options.format = WriteFormat::fits;
        options.compression = compression;
        options.extensions = extensions;
        CAPTURE(std::string(name_of(type)));
        CAPTURE(static_cast<int>(compression));
        CAPTURE(extensions);
        check_round_trip(folder, type, options, compression == WriteCompression::none);
      }
    }
  }
}

TEST_CASE("contiguous strips are one extent a frame") {
  const TestFolder folder;
  const FrameShape shape{64, 50, PixelType::u16};
  WriteOptions options;
  options.rows_per_strip = 3;
  REQUIRE(write_stack(folder / "a.tif", shape, made_up_stack(shape, 2), options));
  const auto file = inspect(folder / "a.tif");
  REQUIRE(file);
  for (const FramePage& page : file->pages) {
    REQUIRE(page.extents.size() == 1);
    CHECK(page.extents[0].first_row == 0);
    CHECK(page.extents[0].rows == 50);
  }
}

TEST_CASE("frames can be decoded in any order, and again") {
  const TestFolder folder;
  const FrameShape shape{40, 30, PixelType::u16};
  const auto stack = made_up_stack(shape, 9);
  for (const auto format : {WriteFormat::tiff, WriteFormat::fits}) {
    WriteOptions options;
    options.format = format;
    options.compression = format == WriteFormat::tiff ? WriteCompression::lzw : WriteCompression::rice;
    REQUIRE(write_stack(folder / "a", shape, stack, options));
    const auto file = inspect(folder / "a");
    REQUIRE(file);
    auto decoder = open_decoder(*file);
    REQUIRE(decoder);
    Bytes frame(frame_bytes(shape));
    for (const int page : {5, 2, 9, 1, 9, 6, 3, 4, 8, 7, 1}) {
      REQUIRE((*decoder)->decode(page, frame.data()));
      CHECK((frame == stack[static_cast<std::size_t>(page - 1)]));
    }
    for (const int page : {0, -1, 10}) CHECK_FALSE((*decoder)->decode(page, frame.data()));
  }
}

TEST_CASE("decoders of one file work in parallel, each in its own thread") {
  const TestFolder folder;
  const FrameShape shape{90, 70, PixelType::u16};
  const auto stack = made_up_stack(shape, 16);
  const WriteOptions ways[] = {
      {.compression = WriteCompression::deflate, .tile_size = 32},
      {.format = WriteFormat::fits, .compression = WriteCompression::rice},
      {.format = WriteFormat::fits, .compression = WriteCompression::gzip, .extensions = true}};
  for (const WriteOptions& options : ways) {
    REQUIRE(write_stack(folder / "a", shape, stack, options));
    const auto file = inspect(folder / "a");
    REQUIRE(file);
    std::vector<Bytes> frames(stack.size(), Bytes(frame_bytes(shape)));
    for (int round = 0; round < 5; ++round) {
      const Status done = for_each_item(static_cast<int>(frames.size()), 4, [&](int item, int) -> Status {
        auto decoder = open_decoder(*file);
        if (!decoder) return decoder.error();
        return (*decoder)->decode(item + 1, frames[static_cast<std::size_t>(item)].data());
      });
      REQUIRE_MESSAGE(done, to_line(done.error()));
      CHECK((frames == stack));
    }
  }
}

TEST_CASE("the same frames and options give the same bytes") {
  const TestFolder folder;
  const FrameShape shape{33, 20, PixelType::u16};
  const auto stack = made_up_stack(shape, 3);
  const std::pair<WriteFormat, WriteCompression> ways[] = {{WriteFormat::tiff, WriteCompression::none},
                                                           {WriteFormat::tiff, WriteCompression::deflate},
                                                           {WriteFormat::fits, WriteCompression::none},
                                                           {WriteFormat::fits, WriteCompression::rice}};
  for (const auto& [format, compression] : ways) {
    WriteOptions options;
    options.format = format;
    options.compression = compression;
    options.extensions = true;
    REQUIRE(write_stack(folder / "a", shape, stack, options));
    REQUIRE(write_stack(folder / "b", shape, stack, options));
    CHECK((read_bytes(folder / "a") == read_bytes(folder / "b")));
  }
}

TEST_CASE("keywords reach the FITS header, the time as RFC 3339, numbers to the last bit") {
  const TestFolder folder;
  const FrameShape shape{8, 4, PixelType::u16};
  WriteOptions options;
  options.format = WriteFormat::fits;
  options.text_keywords = {{"DATE-OBS", "2026-11-24T09:30:00.5"}, {"FILTER", "it's red"}};
  options.number_keywords = {{"EXPTIME", 0.1}, {"CCD-TEMP", -10.0}, {"DARKRATE", 2.5e-7}};
  for (const auto compression : {WriteCompression::none, WriteCompression::gzip}) {
    options.compression = compression;
    REQUIRE(write_stack(folder / "a.fits", shape, made_up_stack(shape, 2), options));
    const auto file = inspect(folder / "a.fits");
    REQUIRE(file);
    CHECK(file->header.acquired.value_or("") == "2026-11-24T09:30:00.5Z");
    const Bytes bytes = read_bytes(folder / "a.fits");
    const std::string text(bytes.begin(), bytes.end());
    CHECK(text.find("EXPTIME =                  0.1 ") != std::string::npos);
    CHECK(text.find("CCD-TEMP=                 -10. ") != std::string::npos);
    CHECK(text.find("DARKRATE=              2.5E-07 ") != std::string::npos);
    CHECK(text.find("FILTER  = 'it''s red'") != std::string::npos);
  }
}

TEST_CASE("what cannot be written is refused with the reason") {
  const TestFolder folder;
  const FrameShape shape{8, 4, PixelType::f32};
  const auto stack = made_up_stack(shape, 2);
  const auto refusal = [&](const WriteOptions& options) {
    const Status status = write_stack(folder / "a", shape, stack, options);
    return status ? std::string() : to_line(status.error());
  };
  WriteOptions rice{.format = WriteFormat::fits, .compression = WriteCompression::rice};
  CHECK(refusal(rice).find("expected integers for Rice") != std::string::npos);
  rice.format = WriteFormat::tiff;
  CHECK(refusal(rice).find("expected one of TIFF") != std::string::npos);
  WriteOptions lzw{.format = WriteFormat::fits, .compression = WriteCompression::lzw};
  CHECK(refusal(lzw).find("expected one of FITS") != std::string::npos);
  CHECK(refusal(WriteOptions{.tile_size = 20}).find("multiple of 16") != std::string::npos);
  for (const auto format : {WriteFormat::tiff, WriteFormat::fits}) {
    WriteOptions options;
    options.format = format;
    auto absent = create_frames(folder / "no/such/folder.x", shape, 1, options);
    CHECK_FALSE(absent);
    if (absent) continue;
    CHECK(absent.error().code == Errc::output);
    CHECK(to_line(absent.error()).find("folder.x") != std::string::npos);
    auto writer = create_frames(folder / "short", shape, 3, options);
    REQUIRE(writer);
    REQUIRE((*writer)->add(stack[0].data()));
    const Status finished = (*writer)->finish();
    REQUIRE_FALSE(finished);
    CHECK(finished.error().what == "found 1 frames, expected 3");
  }
}

TEST_CASE("a full disk is an error of the writer") {
  // /dev/full takes no byte; it exists on Linux.
  if (!std::filesystem::exists("/dev/full")) {
    MESSAGE("no /dev/full here");
    return;
  }
  const FrameShape shape{400, 300, PixelType::u16};
  const Status status = write_stack("/dev/full", shape, made_up_stack(shape, 1), WriteOptions{});
  REQUIRE_FALSE(status);
  CHECK(status.error().code == Errc::output);
}
