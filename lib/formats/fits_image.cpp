#include "formats/fits_image.h"

#include <algorithm>
#include <array>
#include <bit>
#include <cmath>
#include <limits>
#include <mutex>

#include "base/interrupt.h"
#include "base/text.h"
#include "formats/acquisition_time.h"
#include "formats/frame_limits.h"

namespace evenfield {

namespace {

constexpr int kMaxAxes = 9;
using AxisNumbers = std::array<long, kMaxAxes>;
constexpr std::size_t kPieceBytes = std::size_t{16} << 20U;
constexpr double kMaxOverhang = 1 << 24;  // pixels of a tile that is larger than its image

/// Reads the header of the current part of a handle.
class ImageReader {
 public:
  ImageReader(fitsfile* handle, const FitsHdu& part, Where where)
      : handle_(handle), part_(part), where_(std::move(where)) {}

  /// When the exposure began, if this header says it.
  std::optional<std::string> acquired() const {
    const auto time = text("DATE-OBS");
    return time ? time_from_fits(*time) : std::nullopt;
  }

  /// Nothing if the part is a table or has no pixels.
  Result<std::optional<FitsImage>> read() {
    int status = 0;
    const bool compressed = fits_is_compressed_image(handle_, &status) != 0;
    if (status != 0) return failed("", status);
    if (part_.part != FitsPart::image && !compressed) return std::optional<FitsImage>();
    const auto filled = read_axes();
    if (!filled) return filled.error();
    if (!*filled) return std::optional<FitsImage>();
    const Status type = read_type();
    if (!type) return type.error();
    const Status place = compressed ? check_compression() : check_place();
    if (!place) return place.error();
    image_.raw = image_.raw && !compressed;
    return std::optional<FitsImage>(image_);
  }

 private:
  Error wrong(const std::string& key, const std::string& found, const std::string& expected) const {
    Where where = where_;
    where.key = key;
    return Error{Errc::input, where, "found " + found + ", expected " + expected};
  }
  Error failed(const std::string& key, int status) const {
    Where where = where_;
    where.key = key;
    return Error{Errc::input, where, "cannot be read: " + fits_words(status)};
  }

  /// False if the image is empty.
  Result<bool> read_axes() {
    int status = 0;
    int axes = 0;
    std::array<LONGLONG, kMaxAxes> lengths{};
    fits_get_img_paramll(handle_, kMaxAxes, &bits_, &axes, lengths.data(), &status);
    if (status != 0) return failed("NAXIS", status);
    if (axes > kMaxAxes) return wrong("NAXIS", std::to_string(axes), "at most " + std::to_string(kMaxAxes));
    const auto end = lengths.begin() + axes;
    if (axes == 0 || std::find(lengths.begin(), end, 0) != end) return false;
    if (axes == 1) return wrong("NAXIS", "1", "2 or more");
    for (int axis = 0; axis < axes; ++axis) {
      const LONGLONG length = lengths[static_cast<std::size_t>(axis)];
      image_.axes.push_back(static_cast<long>(length));
      if (length < 0) return wrong("NAXIS" + std::to_string(axis + 1), std::to_string(length), "at least 0");
      if (axis < 2) continue;
      image_.planes *= std::min(static_cast<std::uint64_t>(length), kMaxPages + 1);
      if (image_.planes > kMaxPages) {
        return wrong("NAXIS" + std::to_string(axis + 1), std::to_string(length),
                     "at most " + std::to_string(kMaxPages) + " frames");
      }
    }
    Where size = where_;
    size.key = "NAXIS1 and NAXIS2";
    const Status fits = check_frame_size(static_cast<std::uint64_t>(lengths[0]),
                                         static_cast<std::uint64_t>(lengths[1]), size);
    if (!fits) return fits.error();
    image_.shape.width = static_cast<int>(lengths[0]);
    image_.shape.height = static_cast<int>(lengths[1]);
    return true;
  }

  Status read_type() {
    const auto zero = number("BZERO", 0.0);
    if (!zero) return zero.error();
    const auto scale = number("BSCALE", 1.0);
    if (!scale) return scale.error();
    if (*scale == 0.0) return wrong("BSCALE", "0", "another number");
    const bool plain = *scale == 1.0 && *zero == 0.0;
    const auto convention = [&](double half) { return *scale == 1.0 && *zero == half; };
    image_.raw = true;
    PixelType& type = image_.shape.type;
    bool& flip = image_.encoding.flip_sign_bit;
    switch (bits_) {
      case BYTE_IMG:
        flip = convention(-128.0);
        type = flip ? PixelType::i8 : PixelType::u8;
        break;
      case SHORT_IMG:
        flip = convention(32768.0);
        type = flip ? PixelType::u16 : PixelType::i16;
        break;
      case LONG_IMG:
        flip = convention(2147483648.0);
        type = flip ? PixelType::u32 : PixelType::i32;
        break;
      case FLOAT_IMG:
        type = PixelType::f32;
        break;
      case DOUBLE_IMG:
        type = PixelType::f64;
        break;
      default:
        return wrong("BITPIX", std::to_string(bits_), "8, 16, 32, -32 or -64");
    }
    if (!plain && !flip) {
      type = PixelType::f64;
      image_.raw = false;
    }
    image_.encoding.swap_bytes = std::endian::native == std::endian::little && bytes_per_pixel(type) > 1;
    // Undefined pixels have to be looked for.
    if (bits_ > 0 && has("BLANK")) image_.raw = false;
    return Done{};
  }

  std::uint64_t stored_bytes() const {
    return static_cast<std::uint64_t>(image_.shape.width) * static_cast<std::uint64_t>(image_.shape.height) *
           static_cast<std::uint64_t>(std::abs(bits_) / 8);
  }

  /// Two views of one header, the layout's and CFITSIO's, have to agree before bytes are read by offset.
  Status check_place() {
    LONGLONG start = 0;
    int status = 0;
    fits_get_hduaddrll(handle_, nullptr, &start, nullptr, &status);
    if (status != 0) return failed("", status);
    if (static_cast<std::uint64_t>(start) != part_.data_offset ||
        stored_bytes() * image_.planes != part_.data_bytes) {
      return wrong("NAXIS", "contradictory sizes", "each keyword once, PCOUNT 0 and GCOUNT 1");
    }
    image_.data_offset = part_.data_offset;
    return Done{};
  }

  Status check_compression() {
    const auto name = text("ZCMPTYPE");
    if (!name) return name.error();
    if (*name != "RICE_1" && *name != "RICE_ONE" && *name != "GZIP_1" && *name != "GZIP_2") {
      return wrong("ZCMPTYPE", "'" + *name + "'", "RICE_1, GZIP_1 or GZIP_2");
    }
    image_.gzip = name->starts_with("GZIP");
    image_.data_bytes = part_.data_bytes;
    const double pixels = 1.0 * image_.shape.width * image_.shape.height * static_cast<double>(image_.planes);
    double tile_pixels = 1.0;
    for (std::size_t axis = 0; axis < image_.axes.size(); ++axis) {
      const std::string key = "ZTILE" + std::to_string(axis + 1);
      // FITS Standard 4.0, section 10.1.1: without the keyword, tiles are rows.
      const auto length = number(key, axis == 0 ? static_cast<double>(image_.axes[0]) : 1.0);
      if (!length) return length.error();
      tile_pixels *= *length;
      // Tiles may overhang the image; ones out of all proportion would only cost memory.
      if (*length < 1.0 || *length != std::floor(*length) || tile_pixels > std::max(pixels, kMaxOverhang)) {
        return wrong(key, to_text(*length), "1 or more, and tiles no larger than the image");
      }
      image_.tile.push_back(static_cast<long>(*length));
    }
    const double bytes = static_cast<double>(stored_bytes()) * static_cast<double>(image_.planes);
    if (bytes > static_cast<double>(part_.data_bytes) * static_cast<double>(kMaxDeflateRatio)) {
      return wrong("ZNAXIS", std::to_string(part_.data_bytes) + " bytes of packed data",
                   "enough for " + to_text(bytes) + " bytes");
    }
    return Done{};
  }

  bool has(const char* key) const {
    std::array<char, FLEN_CARD> card{};
    int status = 0;
    fits_read_card(handle_, key, card.data(), &status);
    fits_clear_errmsg();
    return status == 0;
  }

  Result<double> number(const std::string& key, double absent) const {
    double value = absent;
    int status = 0;
    fits_read_key(handle_, TDOUBLE, key.c_str(), &value, nullptr, &status);
    if (status == KEY_NO_EXIST || status == VALUE_UNDEFINED) {
      fits_clear_errmsg();
      return absent;
    }
    if (status != 0) return failed(key, status);
    if (!std::isfinite(value)) return wrong(key, to_text(value), "a finite number");
    return value;
  }

  Result<std::string> text(const char* key) const {
    std::array<char, FLEN_VALUE> value{};
    int status = 0;
    fits_read_key(handle_, TSTRING, key, value.data(), nullptr, &status);
    if (status == KEY_NO_EXIST || status == VALUE_UNDEFINED) {
      fits_clear_errmsg();
      return std::string();
    }
    if (status != 0) return failed(key, status);
    return std::string(value.data());
  }

  fitsfile* handle_;
  const FitsHdu& part_;
  Where where_;
  int bits_ = 0;
  FitsImage image_;
};

/// Reads a box of pixels; true if some were undefined.
bool read_piece(fitsfile* handle,
                PixelType pixel_type,
                AxisNumbers& first,
                AxisNumbers& last,
                void* pixels,
                int* status) {
  AxisNumbers step{};
  step.fill(1);
  // A value that stands in for undefined pixels has to be given, or CFITSIO does not look for them. Of floats
  // it is not-a-number, which is what an undefined pixel of an uncompressed image holds in any case.
  constexpr double kNotANumber = std::numeric_limits<double>::quiet_NaN();
  int undefined = 0;
  const auto read = [&](int type, auto instead) {
    fits_read_subset(handle, type, first.data(), last.data(), step.data(), &instead, pixels, &undefined,
                     status);
  };
  switch (pixel_type) {
    case PixelType::u8:
      read(TBYTE, static_cast<unsigned char>(1));
      break;
    case PixelType::i8:
      read(TSBYTE, static_cast<signed char>(1));
      break;
    case PixelType::u16:
      read(TUSHORT, static_cast<unsigned short>(1));
      break;
    case PixelType::i16:
      read(TSHORT, static_cast<short>(1));
      break;
    case PixelType::u32:
      read(TUINT, 1U);
      break;
    case PixelType::i32:
      read(TINT, 1);
      break;
    case PixelType::f32:
      read(TFLOAT, static_cast<float>(kNotANumber));
      break;
    case PixelType::f64:
      read(TDOUBLE, kNotANumber);
      break;
  }
  return undefined != 0;
}

}  // namespace

Result<FitsHandle> open_fits(const std::filesystem::path& path, const std::string& name) {
  fitsfile* raw = nullptr;
  int status = 0;
  // The library sets itself up at its first call, behind a flag that it reads without a lock.
  static std::once_flag set_up;
  std::call_once(set_up, [] { fits_init_cfitsio(); });
  fits_open_diskfile(&raw, name.c_str(), READONLY, &status);
  FitsHandle handle(raw);
  if (status != 0) return Error{Errc::input, {path, {}, {}, {}}, "cannot be read: " + fits_words(status)};
  return handle;
}

Result<FitsImages> read_fits_images(const std::filesystem::path& path,
                                    fitsfile* handle,
                                    const std::vector<FitsHdu>& parts) {
  FitsImages out;
  std::uint64_t pages = 0;
  for (std::size_t i = 0; i < parts.size(); ++i) {
    const int hdu = static_cast<int>(i) + 1;
    const Where where{path, {}, hdu, {}};
    int status = 0;
    fits_movabs_hdu(handle, hdu, nullptr, &status);
    if (status != 0) return Error{Errc::input, where, "cannot be read: " + fits_words(status)};
    if (parts[i].part == FitsPart::other) continue;
    ImageReader reader(handle, parts[i], where);
    if (!out.acquired) out.acquired = reader.acquired();
    auto image = reader.read();
    if (!image) return image.error();
    if (!*image) continue;
    (*image)->hdu = hdu;
    pages += (*image)->planes;
    if (pages > kMaxPages) {
      return Error{Errc::input, where, "found more frames than " + std::to_string(kMaxPages)};
    }
    out.images.push_back(std::move(**image));
  }
  return out;
}

int fits_rows_apart(const FitsImage& image) {
  if (image.tile.empty() || image.gzip || is_floating(image.shape.type)) return 0;
  for (std::size_t axis = 2; axis < image.tile.size(); ++axis)
    if (image.tile[axis] != 1) return 0;
  const std::uint64_t bytes = static_cast<std::uint64_t>(image.tile[1]) *
                              static_cast<std::uint64_t>(image.axes[0]) * bytes_per_pixel(image.shape.type);
  return image.tile[1] < image.axes[1] && bytes <= kMostBytesApart ? static_cast<int>(image.tile[1]) : 0;
}

Status read_fits_rows(
    fitsfile* handle, const FitsImage& image, std::uint64_t plane, int first_row, int rows, void* pixels) {
  int status = 0;
  fits_movabs_hdu(handle, image.hdu, nullptr, &status);
  if (status != 0) return Error{Errc::input, {}, "cannot be decoded: " + fits_words(status)};
  AxisNumbers first{};
  AxisNumbers last{};
  first[0] = 1;
  last[0] = image.axes[0];
  for (std::size_t axis = 2; axis < image.axes.size(); ++axis) {
    const auto length = static_cast<std::uint64_t>(image.axes[axis]);
    first[axis] = last[axis] = static_cast<long>(plane % length) + 1;
    plane /= length;
  }
  // In pieces of whole tiles, so that a wish to stop is seen in the middle of a large frame.
  const long end = std::min(static_cast<long>(first_row) + rows, image.axes[1]);
  const long tile_height = image.tile.empty() ? 1 : image.tile[1];
  const std::size_t row_bytes = static_cast<std::size_t>(image.axes[0]) * bytes_per_pixel(image.shape.type);
  const long piece_rows =
      std::max(static_cast<long>(kPieceBytes / row_bytes) / tile_height, 1L) * tile_height;
  bool undefined = false;
  for (long y = first_row; y < end && status == 0; y += piece_rows) {
    if (interrupt_requested()) return interrupted();
    first[1] = y + 1;
    last[1] = std::min(y + piece_rows, end);
    auto* to = static_cast<unsigned char*>(pixels) + static_cast<std::size_t>(y - first_row) * row_bytes;
    undefined = read_piece(handle, image.shape.type, first, last, to, &status) || undefined;
  }
  if (status != 0) return Error{Errc::input, {}, "cannot be decoded: " + fits_words(status)};
  int bits = 0;
  fits_get_img_type(handle, &bits, &status);
  if (status != 0) return Error{Errc::input, {}, "cannot be decoded: " + fits_words(status)};
  if (bits > 0 && undefined) {
    return Error{Errc::input, {{}, {}, {}, "BLANK"}, "found undefined pixels, expected none"};
  }
  return Done{};
}

}  // namespace evenfield
