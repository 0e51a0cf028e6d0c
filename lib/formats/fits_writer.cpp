#include "formats/fits_writer.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <string>

#include "base/text.h"
#include "formats/fits_handle.h"

namespace evenfield {

namespace {

struct FitsType {
  int image;   ///< what CFITSIO writes as BITPIX, and as BZERO where the convention needs it
  int memory;  ///< what the caller's pixels are
};

FitsType fits_type(PixelType type) {
  switch (type) {
    case PixelType::u8:
      return {BYTE_IMG, TBYTE};
    case PixelType::i8:
      return {SBYTE_IMG, TSBYTE};
    case PixelType::u16:
      return {USHORT_IMG, TUSHORT};
    case PixelType::i16:
      return {SHORT_IMG, TSHORT};
    case PixelType::u32:
      return {ULONG_IMG, TUINT};
    case PixelType::i32:
      return {LONG_IMG, TINT};
    case PixelType::f32:
      return {FLOAT_IMG, TFLOAT};
    case PixelType::f64:
      break;
  }
  return {DOUBLE_IMG, TDOUBLE};
}

constexpr std::size_t kMaxText = 68;  // characters between the quotes of one card

class FitsWriter : public FrameWriter {
 public:
  FitsWriter(
      std::filesystem::path path, FrameShape shape, int frames, WriteOptions options, FitsHandle handle)
      : path_(std::move(path)),
        shape_(shape),
        frames_(frames),
        options_(std::move(options)),
        handle_(std::move(handle)) {}

  Status add(const void* pixels) override {
    if (written_ >= frames_) return error("", "found one more frame, expected " + std::to_string(frames_));
    if (!handle_) return error("", "is closed already");
    if (written_ == 0 || options_.extensions) {
      Status header = write_header();
      if (!header) return header;
    }
    int status = 0;
    const LONGLONG count = static_cast<LONGLONG>(shape_.width) * shape_.height;
    std::array<long, 3> first{1, 1, options_.extensions ? 1 : long{written_} + 1};
    // CFITSIO takes a pointer to mutable pixels, and reads them only.
    fits_write_pix(handle_.get(), fits_type(shape_.type).memory, first.data(), count,
                   const_cast<void*>(pixels), &status);
    if (status != 0) return failed("", status);
    ++written_;
    return Done{};
  }

  Status finish() override {
    if (written_ != frames_) {
      return error("", "found " + std::to_string(written_) + " frames, expected " + std::to_string(frames_));
    }
    int status = 0;
    fits_close_file(handle_.release(), &status);
    if (status != 0) return failed("", status);
    return Done{};
  }

 private:
  Error error(const std::string& key, const std::string& what) const {
    return Error{Errc::output, {path_, {}, written_ + 1, key}, what};
  }
  Error failed(const std::string& key, int status) const {
    return error(key, "cannot be written: " + fits_words(status));
  }

  Status write_header() {
    std::array<long, 3> axes{shape_.width, shape_.height, frames_};
    const int dimensions = options_.extensions || frames_ == 1 ? 2 : 3;
    int status = 0;
    if (written_ == 0 && options_.extensions)
      fits_create_img(handle_.get(), BYTE_IMG, 0, axes.data(), &status);
    if (options_.compression != WriteCompression::none) {
      const bool rice = options_.compression == WriteCompression::rice;
      fits_set_compression_type(handle_.get(), rice ? RICE_1 : GZIP_1, &status);
      // Without this, floats would be rounded to multiples of a part of their noise.
      fits_set_quantize_level(handle_.get(), 0.0F, &status);
    }
    fits_create_img(handle_.get(), fits_type(shape_.type).image, dimensions, axes.data(), &status);
    if (status != 0) return failed("", status);
    for (const auto& [name, text] : options_.text_keywords) {
      if (text.size() > kMaxText) {
        return error(name, "found " + std::to_string(text.size()) + " characters, expected at most " +
                               std::to_string(kMaxText));
      }
      std::string value = text;
      fits_update_key(handle_.get(), TSTRING, name.c_str(), value.data(), nullptr, &status);
      if (status != 0) return failed(name, status);
    }
    for (const auto& [name, number] : options_.number_keywords) {
      Status written = write_number(name, number);
      if (!written) return written;
    }
    return Done{};
  }

  /// The shortest form that reads back to the same number; CFITSIO itself offers a fixed number of digits.
  Status write_number(const std::string& name, double number) {
    if (!std::isfinite(number)) return error(name, "found " + to_text(number) + ", expected a finite number");
    std::string value = to_text(number);
    std::replace(value.begin(), value.end(), 'e', 'E');
    if (value.find('.') == std::string::npos && value.find('E') == std::string::npos) value += ".";
    if (name.empty() || name.size() > 8) return error(name, "expected a name of 1 to 8 characters");
    std::string card = name + std::string(8 - name.size(), ' ') + "= ";
    card += std::string(value.size() < 20 ? 20 - value.size() : 0, ' ') + value;
    int status = 0;
    fits_update_card(handle_.get(), name.c_str(), card.data(), &status);
    return status == 0 ? Status(Done{}) : Status(failed(name, status));
  }

  std::filesystem::path path_;
  FrameShape shape_;
  int frames_;
  WriteOptions options_;
  FitsHandle handle_;
  int written_ = 0;
};

}  // namespace

Result<std::unique_ptr<FrameWriter>> create_fits(const std::filesystem::path& path,
                                                 const FrameShape& shape,
                                                 int frames,
                                                 const WriteOptions& options) {
  const Where where{path, {}, {}, {}};
  const WriteCompression compression = options.compression;
  if (compression != WriteCompression::none && compression != WriteCompression::rice &&
      compression != WriteCompression::gzip) {
    return Error{Errc::output, where, "found a compression of TIFF, expected one of FITS"};
  }
  if (compression == WriteCompression::rice && is_floating(shape.type)) {
    return Error{Errc::output, where,
                 std::string("found ") + name_of(shape.type) + ", expected integers for Rice"};
  }
  // CFITSIO does not write over a file. An absolute name keeps it from giving "~" a meaning.
  std::error_code failure;
  const std::filesystem::path name = std::filesystem::absolute(path, failure);
  if (!failure && std::filesystem::is_regular_file(name, failure)) std::filesystem::remove(name, failure);
  if (name.string().size() >= FLEN_FILENAME - 1) {
    return Error{Errc::output, where,
                 "found a path of " + std::to_string(name.string().size()) + " bytes, expected fewer than " +
                     std::to_string(FLEN_FILENAME - 1)};
  }
  fitsfile* raw = nullptr;
  int status = 0;
  fits_create_diskfile(&raw, name.c_str(), &status);
  FitsHandle handle(raw);
  if (status != 0) return Error{Errc::output, where, "cannot be written: " + fits_words(status)};
  return std::unique_ptr<FrameWriter>(
      std::make_unique<FitsWriter>(path, shape, frames, options, std::move(handle)));
}

}  // namespace evenfield
