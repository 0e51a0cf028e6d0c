#pragma once
/// A folder of one test, removed at its end, and small TIFF files written byte by byte, so that the readers
/// are not tested with the writer of the same hands.

#include <doctest/doctest.h>
#include <stdlib.h>

#include <filesystem>
#include <fstream>
#include <string>

namespace evenfield {

class SessionFolder {
  std::filesystem::path path_;

 public:
  SessionFolder() {
    std::string name = (std::filesystem::temp_directory_path() / "evenfield_XXXXXX").string();
    REQUIRE(mkdtemp(name.data()) != nullptr);
    path_ = name;
  }
  SessionFolder(const SessionFolder&) = delete;
  SessionFolder& operator=(const SessionFolder&) = delete;
  ~SessionFolder() {
    std::error_code code;
    std::filesystem::remove_all(path_, code);
  }
  const std::filesystem::path& path() const { return path_; }

  void write(const std::string& name, const std::string& bytes) const {
    std::filesystem::create_directories((path_ / name).parent_path());
    std::ofstream stream(path_ / name, std::ios::binary);
    stream.write(bytes.data(), static_cast<std::streamsize>(bytes.size()));
    stream.close();
    REQUIRE(stream.good());
  }
};

/// Little-endian TIFF 6.0 of `pages` uncompressed grey frames, one strip each; `acquired` as "YYYY:MM:DD
/// HH:MM:SS".
inline std::string tiff_bytes(
    int width, int height, int bits = 16, int pages = 1, const std::string& acquired = "") {
  const auto number = [](std::uint32_t value, int bytes) {
    std::string out;
    for (int i = 0; i < bytes; ++i) out += static_cast<char>(value >> (8 * i) & 0xFFU);
    return out;
  };
  const auto pixel_bytes = static_cast<std::uint32_t>(width * height * bits / 8);
  std::string out = "II" + number(42, 2) + number(8, 4);
  for (int page = 0; page < pages; ++page) {
    const std::uint32_t entries = acquired.empty() ? 8 : 9;
    const auto start = static_cast<std::uint32_t>(out.size());
    const std::uint32_t text_at = start + 2 + 12 * entries + 4;
    const std::uint32_t pixels_at = text_at + 20;
    const auto entry = [&](std::uint32_t tag, std::uint32_t type, std::uint32_t count, std::uint32_t value) {
      out += number(tag, 2) + number(type, 2) + number(count, 4) + number(value, 4);
    };
    out += number(entries, 2);
    entry(256, 4, 1, static_cast<std::uint32_t>(width));
    entry(257, 4, 1, static_cast<std::uint32_t>(height));
    entry(258, 3, 1, static_cast<std::uint32_t>(bits));
    entry(259, 3, 1, 1);  // no compression
    entry(262, 3, 1, 1);  // black is zero
    entry(273, 4, 1, pixels_at);
    entry(278, 4, 1, static_cast<std::uint32_t>(height));
    entry(279, 4, 1, pixel_bytes);
    if (!acquired.empty()) entry(306, 2, 20, text_at);
    const std::uint32_t behind = pixels_at + pixel_bytes + (pixel_bytes & 1U);
    out += number(page + 1 < pages ? behind : 0, 4);
    std::string text = acquired;
    text.resize(20, '\0');
    out += text + std::string(behind - pixels_at, '\x01');
  }
  return out;
}

}  // namespace evenfield
