#include <array>
#include <cstdio>
#include <cstdlib>
#include <map>
#include <sstream>

#include "frames_on_disk.h"

using namespace evenfield;

// tifffile and astropy write and we read; we write and they read. See witness.py for the lines that they
// print.

namespace {

const std::string kWitness = "/usr/bin/python3 -B " EVENFIELD_SOURCE_DIR "/tests/formats/witness.py ";

/// Debian's Python with tifffile and astropy, or a message.
bool witness_absent() {
  if (std::system("/usr/bin/python3 -c 'import tifffile, astropy' 2>/dev/null") == 0) return false;
  MESSAGE("no python3 with tifffile and astropy here");
  return true;
}

struct WitnessLine {
  std::string file;
  int page = 0;
  std::string type;
  int width = 0, height = 0;
  double sum = 0, mean = 0, low = 0, high = 0;
};

std::vector<WitnessLine> run_witness(const std::string& arguments) {
  std::vector<WitnessLine> lines;
  const std::string command = kWitness + arguments;
  FILE* pipe = ::popen(command.c_str(), "r");
  REQUIRE(pipe != nullptr);
  std::array<char, 1000> text{};
  while (std::fgets(text.data(), static_cast<int>(text.size()), pipe) != nullptr) {
    WitnessLine line;
    std::istringstream words(text.data());
    words >> line.file >> line.page >> line.type >> line.width >> line.height >> line.sum >> line.mean >>
        line.low >> line.high;
    CHECK(words);
    lines.push_back(line);
  }
  CHECK(::pclose(pipe) == 0);
  return lines;
}

PixelType type_of(const std::string& name) {
  const std::map<std::string, PixelType> types{{"uint8", PixelType::u8},    {"int8", PixelType::i8},
                                               {"uint16", PixelType::u16},  {"int16", PixelType::i16},
                                               {"uint32", PixelType::u32},  {"int32", PixelType::i32},
                                               {"float32", PixelType::f32}, {"float64", PixelType::f64}};
  return types.at(name);
}

void check_frame(const WitnessLine& line, const Bytes& frame, const FrameShape& shape) {
  CHECK(shape == FrameShape{line.width, line.height, type_of(line.type)});
  const FrameStatistics found = statistics_of(frame, shape.type);
  const double count = static_cast<double>(shape.width) * static_cast<double>(shape.height);
  CHECK(found.low == line.low);
  CHECK(found.high == line.high);
  // Sums of doubles in another order: a few thousand roundings of 1e-16 of the largest partial sum.
  const double scale = std::max(std::abs(line.low), std::abs(line.high));
  CHECK(std::abs(found.mean - line.mean) <= 1e-12 * scale);
  CHECK(std::abs(found.mean * count - line.sum) <= 1e-12 * scale * count);
}

}  // namespace

TEST_CASE("what tifffile and astropy write, we read with the same statistics") {
  if (witness_absent()) return;
  const TestFolder folder;
  const auto lines = run_witness("write " + folder.path().string());
  std::map<std::string, std::vector<WitnessLine>> by_file;
  for (const WitnessLine& line : lines) by_file[line.file].push_back(line);
  CHECK(by_file.size() > 80);
  for (const auto& [name, frames] : by_file) {
    CAPTURE(name);
    const auto file = inspect(folder / name);
    REQUIRE_MESSAGE(file, to_line(file.error()));
    REQUIRE(file->pages.size() == frames.size());
    const auto decoded = decode_all(*file);
    REQUIRE_MESSAGE(decoded, to_line(decoded.error()));
    for (std::size_t i = 0; i < frames.size(); ++i) {
      check_frame(frames[i], (*decoded)[i], file->pages[i].shape);
      if (!file->pages[i].extents.empty()) {
        CHECK((read_by_extents(folder / name, file->pages[i]) == (*decoded)[i]));
      }
    }
  }
}

TEST_CASE("what we write, tifffile and astropy read with the same statistics") {
  if (witness_absent()) return;
  const TestFolder folder;
  std::string arguments = "read";
  std::map<std::string, std::pair<FrameShape, std::vector<Bytes>>> written;
  const auto write = [&](const std::string& name, PixelType type, const WriteOptions& options) {
    const FrameShape shape{70, 45, type};
    auto stack = made_up_stack(shape, 3);
    const Status status = write_stack(folder / name, shape, stack, options);
    REQUIRE_MESSAGE(status, to_line(status.error()));
    written.emplace(name, std::pair(shape, std::move(stack)));
    arguments += " " + (folder / name).string();
  };
  for (const PixelType type : kAllTypes) {
    // The extremes of a float would swallow its sum; the witnesses see integers' to the last unit.
    const std::string stem = std::to_string(static_cast<int>(type));
    WriteOptions options;
    write(stem + "_plain.tif", type, options);
    options.rows_per_strip = 7;
    options.big_endian = true;
    write(stem + "_strips.tif", type, options);
    options.big_tiff = true;
    options.tile_size = 32;
    write(stem + "_tiles.tif", type, options);
    options.compression = WriteCompression::deflate;
    // tifffile without imagecodecs undoes differences of integers only in the machine's order.
    options.big_endian = false;
    if (is_floating(type)) write(stem + "_deflate.tif", type, options);
    options = WriteOptions{.format = WriteFormat::fits};
    write(stem + "_cube.fits", type, options);
    options.extensions = true;
    write(stem + "_extensions.fits", type, options);
    options.compression = WriteCompression::gzip;
    // astropy 5.2 does not undo BZERO of compressed signed bytes.
    if (type != PixelType::i8) write(stem + "_gzip.fits", type, options);
    options.compression = WriteCompression::rice;
    if (!is_floating(type) && type != PixelType::i8) write(stem + "_rice.fits", type, options);
  }
  const auto lines = run_witness(arguments);
  CHECK(lines.size() == 3 * written.size());
  for (const WitnessLine& line : lines) {
    CAPTURE(line.file);
    CAPTURE(line.page);
    const auto& [shape, stack] = written.at(line.file);
    REQUIRE(line.page <= 3);
    check_frame(line, stack[static_cast<std::size_t>(line.page - 1)], shape);
  }
}
