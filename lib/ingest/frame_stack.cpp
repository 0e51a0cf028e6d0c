#include "ingest/frame_stack.h"

#include <fcntl.h>
#include <unistd.h>

#include <algorithm>
#include <bit>
#include <cerrno>
#include <cstring>
#include <filesystem>
#include <map>
#include <vector>

#include "base/parallel.h"
#include "ingest/open_stack.h"

namespace evenfield {
namespace {

/// An open file, closed at the end of its life.
class Descriptor {
  int number_ = -1;

 public:
  Descriptor() = default;
  explicit Descriptor(int number) : number_(number) {}
  Descriptor(Descriptor&& other) noexcept : number_(std::exchange(other.number_, -1)) {}
  Descriptor& operator=(Descriptor&& other) noexcept {
    std::swap(number_, other.number_);
    return *this;
  }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;
  ~Descriptor() {
    if (number_ >= 0) ::close(number_);
  }
  int number() const { return number_; }
  bool open() const { return number_ >= 0; }
};

std::string system_reason() { return std::generic_category().message(errno); }

/// Reads exactly `bytes`; 0, or how many were there (an error of the system counts as none).
bool read_at(int descriptor, void* to, std::size_t bytes, std::uint64_t offset) {
  auto* out = static_cast<char*>(to);
  while (bytes > 0) {
    const ssize_t got = ::pread(descriptor, out, bytes, static_cast<off_t>(offset));
    if (got < 0 && errno == EINTR) continue;
    if (got <= 0) return false;
    out += got;
    bytes -= static_cast<std::size_t>(got);
    offset += static_cast<std::uint64_t>(got);
  }
  return true;
}

bool write_at(int descriptor, const void* from, std::size_t bytes, std::uint64_t offset) {
  const auto* in = static_cast<const char*>(from);
  while (bytes > 0) {
    const ssize_t put = ::pwrite(descriptor, in, bytes, static_cast<off_t>(offset));
    if (put < 0 && errno == EINTR) continue;
    if (put <= 0) return false;
    in += put;
    bytes -= static_cast<std::size_t>(put);
    offset += static_cast<std::uint64_t>(put);
  }
  return true;
}

std::uint16_t swapped(std::uint16_t v) { return __builtin_bswap16(v); }
std::uint32_t swapped(std::uint32_t v) { return __builtin_bswap32(v); }
std::uint64_t swapped(std::uint64_t v) { return __builtin_bswap64(v); }
std::uint8_t swapped(std::uint8_t v) { return v; }

template <class Word>
void to_native_words(void* pixels, std::size_t count, RawEncoding encoding) {
  auto* words = static_cast<Word*>(pixels);
  const Word flip = encoding.flip_sign_bit ? static_cast<Word>(Word{1} << (8 * sizeof(Word) - 1)) : Word{0};
  if (encoding.swap_bytes)
    for (std::size_t i = 0; i < count; ++i) words[i] = static_cast<Word>(swapped(words[i]) ^ flip);
  else if (encoding.flip_sign_bit)
    for (std::size_t i = 0; i < count; ++i) words[i] = static_cast<Word>(words[i] ^ flip);
}

void to_native(void* pixels, std::size_t count, std::size_t pixel_bytes, RawEncoding encoding) {
  if (!encoding.swap_bytes && !encoding.flip_sign_bit) return;
  switch (pixel_bytes) {
    case 1: return to_native_words<std::uint8_t>(pixels, count, encoding);
    case 2: return to_native_words<std::uint16_t>(pixels, count, encoding);
    case 4: return to_native_words<std::uint32_t>(pixels, count, encoding);
    default: return to_native_words<std::uint64_t>(pixels, count, encoding);
  }
}

struct Plane {
  int file = 0;  ///< index into Impl::paths
  int page = 1;
  std::vector<RawExtent> extents;
  RawEncoding encoding;
  bool scratch = false;
};

/// A file without a name: it vanishes with its last descriptor, however the program ends.
Result<Descriptor> scratch_file() {
  std::error_code ignored;
  const std::filesystem::path folder = std::filesystem::temp_directory_path(ignored);
  Descriptor file(::open(folder.c_str(), O_TMPFILE | O_RDWR | O_CLOEXEC, 0600));
  if (file.open()) return file;
  std::string name = (folder / "evenfield-XXXXXX").string();  // file systems without O_TMPFILE
  file = Descriptor(::mkostemp(name.data(), O_CLOEXEC));
  if (!file.open()) return Error{Errc::output, {folder, {}, {}, {}}, "cannot make a scratch file for decoded frames: " + system_reason()};
  ::unlink(name.c_str());
  return file;
}

}  // namespace

struct FrameStack::Impl {
  FrameShape shape;
  std::vector<std::filesystem::path> paths;
  std::vector<Descriptor> open_files;  ///< aligned with paths; not open where there are too many files
  std::vector<Plane> planes;
  Descriptor scratch;
};

int FrameStack::frames() const { return static_cast<int>(impl_->planes.size()); }
FrameShape FrameStack::shape() const { return impl_->shape; }

Error FrameStack::error_at(int frame, std::string what) const {
  const Plane& plane = impl_->planes[static_cast<std::size_t>(std::clamp(frame, 0, frames() - 1))];
  return {Errc::input, {impl_->paths[static_cast<std::size_t>(plane.file)], {}, plane.page, {}}, std::move(what)};
}

Status FrameStack::read_rows(int frame, int y, int rows, void* pixels) const {
  const Plane& plane = impl_->planes[static_cast<std::size_t>(frame)];
  const std::size_t pixel_bytes = bytes_per_pixel(impl_->shape.type);
  const std::size_t row_bytes = static_cast<std::size_t>(impl_->shape.width) * pixel_bytes;
  const auto file = static_cast<std::size_t>(plane.file);
  Descriptor opened;
  int descriptor = plane.scratch ? impl_->scratch.number() : impl_->open_files[file].number();
  if (descriptor < 0) {
    opened = Descriptor(::open(impl_->paths[file].c_str(), O_RDONLY | O_CLOEXEC));
    if (!opened.open()) return error_at(frame, "cannot be opened: " + system_reason());
    descriptor = opened.number();
  }
  for (const RawExtent& extent : plane.extents) {
    const int begin = std::max(y, extent.first_row);
    const int end = std::min(y + rows, extent.first_row + extent.rows);
    if (begin >= end) continue;
    char* to = static_cast<char*>(pixels) + static_cast<std::size_t>(begin - y) * row_bytes;
    const std::size_t bytes = static_cast<std::size_t>(end - begin) * row_bytes;
    const std::uint64_t offset = extent.offset + static_cast<std::uint64_t>(begin - extent.first_row) * row_bytes;
    if (!read_at(descriptor, to, bytes, offset))
      return error_at(frame, "found no pixels of rows " + std::to_string(begin) + " to " + std::to_string(end - 1) +
                                 ", expected " + std::to_string(bytes) + " bytes at offset " + std::to_string(offset) +
                                 "; the file is shorter than its header says or changed while it was read");
  }
  to_native(pixels, static_cast<std::size_t>(rows) * static_cast<std::size_t>(impl_->shape.width), pixel_bytes, plane.encoding);
  return Done{};
}

namespace {

/// Decodes the planes that are not raw into the scratch file. Runs of consecutive pages of one file are one piece of
/// work, so that a decoder walks forward through its file.
Status decode_to_scratch(FrameStack::Impl& stack, const std::vector<const FrameFile*>& files, int threads) {
  const std::size_t frame_bytes = static_cast<std::size_t>(stack.shape.width) * static_cast<std::size_t>(stack.shape.height) *
                                  bytes_per_pixel(stack.shape.type);
  constexpr std::size_t kRun = 4;
  std::vector<std::pair<std::size_t, std::size_t>> runs;  // begin and end in planes
  std::size_t decoded = 0;
  for (std::size_t i = 0; i < stack.planes.size(); ++i) {
    Plane& plane = stack.planes[i];
    if (!plane.extents.empty()) continue;
    plane.scratch = true;
    const bool continues = !runs.empty() && runs.back().second == i && i - runs.back().first < kRun &&
                           stack.planes[i - 1].file == plane.file;
    if (continues)
      ++runs.back().second;
    else
      runs.emplace_back(i, i + 1);
    plane.extents = {{0, stack.shape.height, frame_bytes * decoded++}};
    plane.encoding = {};
  }
  if (runs.empty()) return Done{};
  auto scratch = scratch_file();
  if (!scratch) return scratch.error();
  stack.scratch = std::move(*scratch);

  struct Worker {
    std::unique_ptr<FrameDecoder> decoder;
    int file = -1;
    std::vector<std::byte> frame;
  };
  std::vector<Worker> workers(static_cast<std::size_t>(std::max(1, threads)));
  return for_each_item(static_cast<int>(runs.size()), threads, [&](int item, int number) -> Status {
    Worker& worker = workers[static_cast<std::size_t>(number)];
    worker.frame.resize(frame_bytes);
    for (std::size_t i = runs[static_cast<std::size_t>(item)].first; i < runs[static_cast<std::size_t>(item)].second; ++i) {
      const Plane& plane = stack.planes[i];
      if (worker.file != plane.file) {
        auto decoder = open_decoder(*files[static_cast<std::size_t>(plane.file)]);
        if (!decoder) return decoder.error();
        worker.decoder = std::move(*decoder);
        worker.file = plane.file;
      }
      if (const Status decoded_frame = worker.decoder->decode(plane.page, worker.frame.data()); !decoded_frame) return decoded_frame;
      if (!write_at(stack.scratch.number(), worker.frame.data(), frame_bytes, plane.extents.front().offset)) {
        std::error_code ignored;
        return Error{Errc::output, {std::filesystem::temp_directory_path(ignored), {}, {}, {}},
                     "cannot write decoded frames to the scratch file: " + system_reason()};
      }
    }
    return Done{};
  });
}

}  // namespace

Result<FrameStack> open_stack(const Session& session, const Series& series, const std::vector<FrameFile>& files, int threads) {
  auto impl = std::make_shared<FrameStack::Impl>();
  impl->shape = session.shape;
  std::map<int, int> known;  // file of the session -> file of this series
  std::vector<const FrameFile*> used;
  for (const FrameReference& frame : series.frames) {
    const auto [entry, is_new] = known.try_emplace(frame.file, static_cast<int>(used.size()));
    const FrameFile& file = files[static_cast<std::size_t>(frame.file)];
    if (is_new) {
      used.push_back(&file);
      impl->paths.push_back(file.path);
    }
    const FramePage& page = file.pages[static_cast<std::size_t>(frame.page - 1)];
    impl->planes.push_back({entry->second, frame.page, page.extents, page.encoding, false});
  }
  // A process may have about a thousand files open; series of more files open them for each read.
  constexpr std::size_t kOpenFiles = 256;
  impl->open_files.resize(used.size());
  if (used.size() <= kOpenFiles)
    for (std::size_t i = 0; i < used.size(); ++i) {
      impl->open_files[i] = Descriptor(::open(used[i]->path.c_str(), O_RDONLY | O_CLOEXEC));
      if (!impl->open_files[i].open())
        return Error{Errc::input, {used[i]->path, {}, {}, {}}, "cannot be opened: " + system_reason()};
    }
  if (const Status decoded = decode_to_scratch(*impl, used, threads); !decoded) return decoded.error();
  return FrameStack(std::move(impl));
}

}  // namespace evenfield
