#include "formats/gunzip.h"

#include <zlib.h>

#include <algorithm>
#include <array>
#include <memory>
#include <string>

#include "base/interrupt.h"
#include "formats/frame_limits.h"

namespace evenfield {

namespace {

constexpr std::size_t kChunk = std::size_t{1} << 17U;

/// The unpacked bytes of a gzip file in order.
class GunzipStream {
 public:
  explicit GunzipStream(const DiskFile& file) : file_(file), packed_(kChunk) {
    // 15: the largest window; 16: a gzip header is expected.
    ready_ = inflateInit2(&state_, 15 + 16) == Z_OK;
  }
  ~GunzipStream() {
    if (ready_) inflateEnd(&state_);
  }
  GunzipStream(const GunzipStream&) = delete;
  GunzipStream& operator=(const GunzipStream&) = delete;

  /// Up to `bytes` bytes; fewer only at the end.
  Result<std::size_t> read(char* to, std::size_t bytes) {
    std::size_t done = 0;
    if (!ready_) return damaged("no memory for it");
    while (done < bytes && !ended_) {
      if (interrupt_requested()) return interrupted();
      if (state_.avail_in == 0) {
        const auto got = file_.read_some(offset_, packed_.data(), packed_.size());
        if (!got) return got.error();
        if (*got == 0) return damaged("found " + std::to_string(file_.size()) + " bytes, expected more");
        offset_ += *got;
        state_.next_in = packed_.data();
        state_.avail_in = static_cast<uInt>(*got);
      }
      const std::size_t room = std::min(bytes - done, kChunk);
      state_.next_out = reinterpret_cast<Bytef*>(to + done);
      state_.avail_out = static_cast<uInt>(room);
      const int result = inflate(&state_, Z_NO_FLUSH);
      done += room - state_.avail_out;
      if (result == Z_STREAM_END) {
        const Status next = next_member();
        if (!next) return next.error();
      } else if (result != Z_OK && result != Z_BUF_ERROR) {
        return damaged(state_.msg != nullptr ? state_.msg : "damaged");
      }
    }
    return done;
  }

 private:
  Error damaged(const std::string& what) const {
    return Error{Errc::input, {file_.path(), {}, {}, "gzip data"}, what};
  }

  /// Several gzip files behind each other are one; anything else behind the end is padding.
  Status next_member() {
    std::array<unsigned char, 2> mark{};
    const std::uint64_t at = offset_ - state_.avail_in;
    const auto got = file_.read_some(at, mark.data(), mark.size());
    if (!got) return got.error();
    if (*got < mark.size() || mark[0] != 0x1F || mark[1] != 0x8B) {
      ended_ = true;
      return Done{};
    }
    offset_ = at;
    state_.avail_in = 0;
    if (inflateReset(&state_) != Z_OK) return damaged("damaged");
    return Done{};
  }

  const DiskFile& file_;
  std::vector<unsigned char> packed_;
  std::uint64_t offset_ = 0;  ///< of the packed bytes not yet fetched
  z_stream state_{};
  bool ready_ = false;
  bool ended_ = false;
};

bool is_tiff(const char* bytes, std::size_t count) {
  const std::string_view start(bytes, std::min<std::size_t>(count, 4));
  return start == std::string_view("II*\0", 4) || start == std::string_view("MM\0*", 4) ||
         start == std::string_view("II+\0", 4) || start == std::string_view("MM\0+", 4);
}

}  // namespace

Result<UnpackedFits> unpack_fits(const std::filesystem::path& path, Unpack what) {
  const auto packed = DiskFile::open(path);
  if (!packed) return packed.error();
  auto unpacked = DiskFile::temporary();
  if (!unpacked) return unpacked.error();
  GunzipStream gunzip(*packed);
  std::uint64_t position = 0;
  FitsStream stream;
  stream.read = [&](char* to, std::size_t bytes) -> Result<std::size_t> {
    auto got = gunzip.read(to, bytes);
    if (!got) return got;
    if (position == 0 && is_tiff(to, *got)) {
      return Error{Errc::input,
                   {path, {}, {}, {}},
                   "found a TIFF file packed with gzip, expected FITS: unpack it first (gunzip)"};
    }
    const Status put = unpacked->write(position, to, *got);
    if (!put) return put.error();
    position += *got;
    return got;
  };
  std::vector<char> chunk(kChunk);
  stream.skip = [&](std::uint64_t bytes) -> Result<std::uint64_t> {
    std::uint64_t passed = 0;
    while (passed < bytes) {
      const auto wanted = static_cast<std::size_t>(std::min<std::uint64_t>(bytes - passed, chunk.size()));
      const auto got = gunzip.read(chunk.data(), wanted);
      if (!got) return got.error();
      if (what == Unpack::all) {
        const Status put = unpacked->write(position, chunk.data(), *got);
        if (!put) return put.error();
      }
      passed += *got;
      position += *got;
      if (*got < wanted) break;
    }
    if (what == Unpack::headers) {
      const Status hole = unpacked->extend(position);
      if (!hole) return hole.error();
    }
    return passed;
  };
  stream.most_bytes = packed->size() * kMaxDeflateRatio;
  stream.found = std::to_string(packed->size()) + " packed bytes, which unpack to at most " +
                 std::to_string(stream.most_bytes);
  auto parts = read_fits_layout(path, stream);
  if (!parts) return parts.error();
  // CFITSIO reads by whole blocks.
  const Status whole = unpacked->extend((position + kFitsBlock - 1) / kFitsBlock * kFitsBlock);
  if (!whole) return whole.error();
  return UnpackedFits{std::move(*unpacked), std::move(*parts)};
}

}  // namespace evenfield
