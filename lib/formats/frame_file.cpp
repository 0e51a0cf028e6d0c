#include "formats/frame_file.h"

#include <array>
#include <string_view>

#include "formats/disk_file.h"
#include "formats/fits_reader.h"
#include "formats/tiff_reader.h"

namespace evenfield {

namespace {

enum class Kind { tiff, fits, packed };

/// Told from the first bytes.
Result<Kind> kind_of(const std::filesystem::path& path) {
  const auto file = DiskFile::open(path);
  if (!file) return file.error();
  std::array<char, 9> bytes{};
  const auto got = file->read_some(0, bytes.data(), bytes.size());
  if (!got) return got.error();
  const std::string_view start(bytes.data(), *got);
  const auto starts = [&start](std::string_view mark) { return start.starts_with(mark); };
  // Byte order, then 42 for TIFF or 43 for BigTIFF.
  if (starts({"II*\0", 4}) || starts({"MM\0*", 4}) || starts({"II+\0", 4}) || starts({"MM\0+", 4}))
    return Kind::tiff;
  if (start == "SIMPLE  =") return Kind::fits;
  if (starts("\x1F\x8B")) return Kind::packed;
  const Where where{path, {}, {}, {}};
  if (start.empty()) return Error{Errc::input, where, "found an empty file, expected TIFF or FITS"};
  constexpr std::string_view kDigits = "0123456789abcdef";
  std::string found;
  for (const char byte : start.substr(0, 4)) {
    const auto value = static_cast<unsigned char>(byte);
    found += {' ', kDigits[value / 16U], kDigits[value % 16U]};
  }
  return Error{Errc::input, where, "found a file that begins with" + found + ", expected TIFF or FITS"};
}

}  // namespace

Result<FrameFile> inspect(const std::filesystem::path& path) {
  const auto kind = kind_of(path);
  if (!kind) return kind.error();
  return *kind == Kind::tiff ? inspect_tiff(path) : inspect_fits(path, *kind == Kind::packed);
}

Result<std::unique_ptr<FrameDecoder>> open_decoder(const FrameFile& file) {
  const auto kind = kind_of(file.path);
  if (!kind) return kind.error();
  if ((*kind == Kind::tiff) != (file.format == FileFormat::tiff)) {
    return Error{Errc::input, {file.path, {}, {}, {}}, "changed while it was read"};
  }
  return *kind == Kind::tiff ? open_tiff_decoder(file) : open_fits_decoder(file, *kind == Kind::packed);
}

}  // namespace evenfield
