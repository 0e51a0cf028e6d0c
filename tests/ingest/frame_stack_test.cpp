#include <doctest/doctest.h>
#include <sys/resource.h>
#include <unistd.h>

#include <cstdint>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "base/progress.h"
#include "formats/frame_writer.h"
#include "ingest/open_stack.h"
#include "ingest/read_ahead.h"
#include "ingest/session_folder.h"

using namespace evenfield;

namespace {

constexpr int kWidth = 24;
constexpr int kHeight = 10;

/// Pixel (x, y) of frame f, so that every byte order or mix-up of frames shows.
std::uint16_t pixel(int f, int x, int y) {
  return static_cast<std::uint16_t>(257 * f + 24 * y + x + 40000 * (x % 2));
}

/// One raw file a frame, most significant byte first with the sign bit flipped, as FITS stores unsigned
/// numbers.
struct RawSession {
  std::filesystem::path folder =
      std::filesystem::temp_directory_path() / ("evenfield_stack_" + std::to_string(::getpid()));
  Session session;
  Series series;
  std::vector<FrameFile> files;

  explicit RawSession(int frames) {
    std::filesystem::create_directories(folder);
    session.shape = {kWidth, kHeight, PixelType::u16};
    for (int f = 0; f < frames; ++f) {
      const auto path = folder / (std::to_string(f) + ".raw");
      std::ofstream out(path, std::ios::binary);
      for (int y = 0; y < kHeight; ++y)
        for (int x = 0; x < kWidth; ++x) {
          const unsigned stored = pixel(f, x, y) ^ 0x8000U;
          out.put(static_cast<char>(stored >> 8U)).put(static_cast<char>(stored & 255U));
        }
      files.push_back({path, FileFormat::fits, {{session.shape, {{0, kHeight, 0}}, {true, true}}}, {}});
      series.frames.push_back({f, 1});
    }
    session.series = {series};
  }
  ~RawSession() { std::filesystem::remove_all(folder); }
  RawSession(const RawSession&) = delete;
  RawSession& operator=(const RawSession&) = delete;
};

void check_all(const FrameStack& stack) {
  std::vector<std::uint16_t> rows(kWidth * 3);
  for (int f = 0; f < stack.frames(); ++f) {
    const Status read = stack.read_rows(f, 4, 3, rows.data(), 0);
    REQUIRE_MESSAGE(read, to_line(read.error()));
    for (int i = 0; i < kWidth * 3; ++i)
      if (rows[static_cast<std::size_t>(i)] != pixel(f, i % kWidth, 4 + i / kWidth))
        FAIL("frame " << f << ", pixel " << i);
  }
}

}  // namespace

TEST_CASE("a series of more files than may be open is read") {
  const RawSession raw(300);
  rlimit before{};
  REQUIRE(::getrlimit(RLIMIT_NOFILE, &before) == 0);
  rlimit few = before;
  few.rlim_cur = 64;
  REQUIRE(::setrlimit(RLIMIT_NOFILE, &few) == 0);
  {
    const auto stack = open_stack(raw.session, raw.series, raw.files, 2);
    REQUIRE_MESSAGE(stack, to_line(stack.error()));
    CHECK(stack->frames() == 300);
    check_all(*stack);
  }
  REQUIRE(::setrlimit(RLIMIT_NOFILE, &before) == 0);
}

TEST_CASE("rows of frames compressed in pieces are those of the frames, wherever they begin and end") {
  const SessionFolder folder;
  constexpr int kSide = 45;
  constexpr int kFrames = 3;
  const FrameShape shape{kSide, kSide, PixelType::u16};
  for (const WriteOptions& options :
       {WriteOptions{.compression = WriteCompression::deflate, .rows_per_strip = 7},
        WriteOptions{.compression = WriteCompression::lzw, .tile_size = 16},
        WriteOptions{
            .format = WriteFormat::fits, .compression = WriteCompression::rice, .extensions = true}}) {
    const auto path = folder.path() / "frames";
    auto writer = create_frames(path, shape, kFrames, options);
    REQUIRE(writer);
    for (int f = 0; f < kFrames; ++f) {
      std::vector<std::uint16_t> frame;
      for (int i = 0; i < kSide * kSide; ++i) frame.push_back(pixel(f, i % kSide, i / kSide));
      REQUIRE((*writer)->add(frame.data()));
    }
    REQUIRE((*writer)->finish());
    auto file = inspect(path);
    REQUIRE(file);
    Session session;
    session.shape = shape;
    session.files = {{path, "frames"}};
    Series series;
    for (int f = 0; f < kFrames; ++f) series.frames.push_back({0, f + 1});
    const std::vector<FrameFile> files{*file};
    Progress progress;
    {
      const auto stack = open_stack(session, series, files, 2, {&progress, nullptr, nullptr});
      REQUIRE_MESSAGE(stack, to_line(stack.error()));
      REQUIRE(stack->rows_apart() == file->pages[0].rows_apart);
      std::vector<std::uint16_t> rows(kSide * kSide);
      for (const int worker : {0, 1})
        for (const auto& [y, count] : {std::pair{0, kSide}, {14, 7}, {3, 9}, {44, 1}, {16, 29}})
          for (int f = 0; f < kFrames; ++f) {
            const Status read = stack->read_rows(f, y, count, rows.data(), worker);
            REQUIRE_MESSAGE(read, to_line(read.error()));
            for (int i = 0; i < kSide * count; ++i)
              REQUIRE(rows[static_cast<std::size_t>(i)] == pixel(f, i % kSide, y + i / kSide));
          }
    }
    CHECK(progress.work_done == reading_work(session, series, files));
  }
}

TEST_CASE("a stack counts its whole work, however little of it was read") {
  const RawSession raw(3);
  Progress progress;
  const std::uint64_t work = reading_work(raw.session, raw.series, raw.files);
  CHECK(work == 3U * kWidth * kHeight * 2U);
  {
    const auto stack = open_stack(raw.session, raw.series, raw.files, 1, {&progress, nullptr, nullptr});
    REQUIRE(stack);
    CHECK(progress.work_done == 0);
    std::vector<std::uint16_t> rows(kWidth * 2);
    REQUIRE(stack->read_rows(1, 0, 2, rows.data(), 0));
    CHECK(progress.work_done == 2U * kWidth * 2U);
  }
  CHECK(progress.work_done == work);
}

TEST_CASE("reading ahead changes nothing, ends when it is told to, and passes over files that are gone") {
  RawSession raw(5);
  Progress progress;
  { const ReadAhead ahead(raw.session, raw.files, {0}, progress); }
  const ReadAhead ahead(raw.session, raw.files, {0}, progress);
  const auto stack = open_stack(raw.session, raw.series, raw.files, 1);
  REQUIRE(stack);
  check_all(*stack);
  std::filesystem::remove(raw.files[2].path);
  const ReadAhead without(raw.session, raw.files, {0}, progress);
}

TEST_CASE("a file that became shorter is an error that names the file and the rows") {
  const RawSession raw(2);
  std::filesystem::resize_file(raw.files[1].path, 100);
  const auto stack = open_stack(raw.session, raw.series, raw.files, 1);
  REQUIRE(stack);
  std::vector<std::uint16_t> rows(kWidth * kHeight);
  const Status read = stack->read_rows(1, 0, kHeight, rows.data(), 0);
  REQUIRE(!read);
  CHECK(to_line(read.error()).find("1.raw") != std::string::npos);
  CHECK(read.error().what.find("rows 0 to 9") != std::string::npos);
}
