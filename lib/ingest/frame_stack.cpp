#include "ingest/frame_stack.h"

#include <sys/resource.h>

#include <algorithm>
#include <atomic>
#include <cstring>
#include <filesystem>
#include <map>
#include <optional>
#include <vector>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "formats/disk_file.h"
#include "formats/raw_pixels.h"
#include "ingest/open_stack.h"
#include "ingest/read_ahead.h"

namespace evenfield {
namespace {

struct Plane {
  int file = 0;  ///< index into Impl::paths
  int page = 1;
  std::vector<RawExtent> extents;
  RawEncoding encoding;
  bool scratch = false;
};

/// What one worker decodes pieces of frames with.
struct PieceReader {
  std::vector<std::unique_ptr<FrameDecoder>> decoders;  ///< [plane]
  std::vector<std::byte> piece;
};

/// Descriptors of a decoder: ours and the library's.
constexpr std::size_t kDecoderFiles = 2;
/// Decoders cost memory too, up to 0.2 MB each: longer series are decoded frame by frame.
constexpr std::size_t kMostDecoders = 32;

/// Rows of a piece, if all frames of a series are made of pieces alike and a decoder for each may stay open;
/// or 0.
int rows_of_pieces(const std::vector<const FramePage*>& pages, int threads) {
  const int rows = pages.front()->rows_apart;
  for (const FramePage* page : pages)
    if (!page->extents.empty() || page->rows_apart != rows) return 0;
  rlimit limit{};
  if (pages.size() > kMostDecoders || ::getrlimit(RLIMIT_NOFILE, &limit) != 0) return 0;
  const std::size_t need = kDecoderFiles * pages.size() * static_cast<std::size_t>(std::max(threads, 1));
  return 2 * need + 64 <= limit.rlim_cur ? rows : 0;
}

/// So many files of a series may stay open; the others are opened for each read. Decoders, the results and
/// the program around need descriptors too, and two series may be open at a time.
std::size_t files_kept_open(int threads) {
  constexpr std::size_t kMost = 4096;
  rlimit limit{};
  if (::getrlimit(RLIMIT_NOFILE, &limit) != 0) return 0;
  const std::size_t reserve = 32 + 4 * static_cast<std::size_t>(std::max(threads, 1));
  const auto allowed = static_cast<std::size_t>(std::min<rlim_t>(limit.rlim_cur, 2 * kMost));
  return allowed > reserve ? std::min((allowed - reserve) * 3 / 8, kMost) : 0;
}

}  // namespace

struct FrameStack::Impl {
  FrameShape shape;
  std::vector<std::filesystem::path> paths;
  std::vector<std::optional<DiskFile>> open_files;  ///< aligned with paths; nothing where there are too many
  std::vector<Plane> planes;
  std::optional<DiskFile> scratch;
  int rows_apart = 0;                       ///< of pieces that workers decode; 0: there are none
  std::vector<const FrameFile*> files;      ///< aligned with paths
  mutable std::vector<PieceReader> pieces;  ///< [worker]
  StackSharing sharing;
  std::uint64_t work = 0;                         ///< of the whole series
  mutable std::atomic<std::uint64_t> counted{0};  ///< of it, so far

  Impl() = default;
  Impl(const Impl&) = delete;
  Impl& operator=(const Impl&) = delete;
  ~Impl() {
    // Rows between regions were not read, rows that regions share were read twice: the sum is put right.
    count(work - counted);
    if (scratch && sharing.scratch != nullptr) sharing.scratch->give_back(std::move(*scratch));
  }
  void count(std::uint64_t done) const {
    if (sharing.progress == nullptr) return;
    counted.fetch_add(done, std::memory_order_relaxed);
    sharing.progress->work_done.fetch_add(done, std::memory_order_relaxed);
  }
};

int FrameStack::frames() const { return static_cast<int>(impl_->planes.size()); }
FrameShape FrameStack::shape() const { return impl_->shape; }

Error FrameStack::error_at(int frame, std::string what) const {
  const Plane& plane = impl_->planes[static_cast<std::size_t>(std::clamp(frame, 0, frames() - 1))];
  return {
      Errc::input, {impl_->paths[static_cast<std::size_t>(plane.file)], {}, plane.page, {}}, std::move(what)};
}

int FrameStack::rows_apart() const { return impl_->rows_apart; }

namespace {

Status decode_pieces(const FrameStack::Impl& stack, int frame, int y, int rows, void* pixels, int worker) {
  PieceReader& reader = stack.pieces[static_cast<std::size_t>(worker)];
  const auto number = static_cast<std::size_t>(frame);
  const Plane& plane = stack.planes[number];
  std::unique_ptr<FrameDecoder>& decoder = reader.decoders[number];
  if (!decoder) {
    auto opened = open_decoder(*stack.files[static_cast<std::size_t>(plane.file)]);
    if (!opened) return opened.error();
    decoder = std::move(*opened);
  }
  const std::size_t row_bytes =
      static_cast<std::size_t>(stack.shape.width) * bytes_per_pixel(stack.shape.type);
  const int begin = y / stack.rows_apart * stack.rows_apart;
  const int end =
      std::min((y + rows + stack.rows_apart - 1) / stack.rows_apart * stack.rows_apart, stack.shape.height);
  if (begin == y && end == y + rows) return decoder->decode_rows(plane.page, begin, rows, pixels);
  reader.piece.resize(std::max(reader.piece.size(), static_cast<std::size_t>(end - begin) * row_bytes));
  const Status decoded = decoder->decode_rows(plane.page, begin, end - begin, reader.piece.data());
  if (!decoded) return decoded;
  std::memcpy(pixels, reader.piece.data() + static_cast<std::size_t>(y - begin) * row_bytes,
              static_cast<std::size_t>(rows) * row_bytes);
  return Done{};
}

}  // namespace

Status FrameStack::read_rows(int frame, int y, int rows, void* pixels, int worker) const {
  if (impl_->rows_apart > 0) {
    if (impl_->sharing.give_up != nullptr && *impl_->sharing.give_up) return interrupted();
    const Status decoded = decode_pieces(*impl_, frame, y, rows, pixels, worker);
    if (decoded)
      impl_->count((1 + kDecodingWork) * static_cast<std::uint64_t>(rows) *
                   static_cast<std::uint64_t>(impl_->shape.width) * bytes_per_pixel(impl_->shape.type));
    return decoded;
  }
  const Plane& plane = impl_->planes[static_cast<std::size_t>(frame)];
  const auto width = static_cast<std::size_t>(impl_->shape.width);
  const std::size_t row_bytes = width * bytes_per_pixel(impl_->shape.type);
  const auto file = static_cast<std::size_t>(plane.file);
  const std::optional<DiskFile>& kept = plane.scratch ? impl_->scratch : impl_->open_files[file];
  std::optional<DiskFile> opened;
  if (!kept) {
    auto now = DiskFile::open(impl_->paths[file]);
    if (!now) return error_at(frame, now.error().what);
    opened.emplace(std::move(*now));
  }
  const DiskFile& bytes = kept ? *kept : *opened;
  for (const RawExtent& extent : plane.extents) {
    const int begin = std::max(y, extent.first_row);
    const int end = std::min(y + rows, extent.first_row + extent.rows);
    if (begin >= end) continue;
    char* to = static_cast<char*>(pixels) + static_cast<std::size_t>(begin - y) * row_bytes;
    const std::size_t wanted = static_cast<std::size_t>(end - begin) * row_bytes;
    const std::uint64_t offset =
        extent.offset + static_cast<std::uint64_t>(begin - extent.first_row) * row_bytes;
    const auto got = bytes.read_some(offset, to, wanted);
    if (!got) return error_at(frame, got.error().what);
    if (*got < wanted)
      return error_at(frame, "found no pixels of rows " + std::to_string(begin) + " to " +
                                 std::to_string(end - 1) + ", expected " + std::to_string(wanted) +
                                 " bytes at offset " + std::to_string(offset) +
                                 "; the file is shorter than its header says or changed while it was read");
  }
  decode_raw(pixels, static_cast<std::size_t>(rows) * width, impl_->shape.type, plane.encoding);
  impl_->count(static_cast<std::uint64_t>(rows) * row_bytes);
  return Done{};
}

namespace {

/// Frames that one worker decodes one after the other.
struct Run {
  std::size_t begin = 0, end = 0;  ///< planes
};

/// Gives the frames that are not raw their place in the scratch file. Any frame is a piece of work of its
/// own, except that a file packed as a whole would be unpacked again by each worker.
std::vector<Run> plan_decoding(FrameStack::Impl& stack,
                               const std::vector<const FrameFile*>& files,
                               std::size_t frame_bytes) {
  std::vector<Run> runs;
  std::size_t decoded = 0;
  for (std::size_t i = 0; i < stack.planes.size(); ++i) {
    Plane& plane = stack.planes[i];
    if (!plane.extents.empty()) continue;
    plane.scratch = true;
    plane.extents = {{0, stack.shape.height, frame_bytes * decoded++}};
    plane.encoding = {};
    const bool continues = files[static_cast<std::size_t>(plane.file)]->packed && !runs.empty() &&
                           runs.back().end == i && stack.planes[i - 1].file == plane.file;
    if (continues)
      ++runs.back().end;
    else
      runs.push_back({i, i + 1});
  }
  return runs;
}

/// A busy disk may hold up a write for long: a wish to stop is seen between two pieces.
Status write_pieces(DiskFile& file, std::uint64_t offset, const std::vector<std::byte>& bytes) {
  constexpr std::size_t kPiece = std::size_t{4} << 20U;
  for (std::size_t at = 0; at < bytes.size(); at += kPiece) {
    if (interrupt_requested()) return interrupted();
    Status put = file.write(offset + at, bytes.data() + at, std::min(kPiece, bytes.size() - at));
    if (!put) return put;
  }
  return Done{};
}

Status decode_to_scratch(FrameStack::Impl& stack, const std::vector<const FrameFile*>& files, int threads) {
  const std::size_t frame_bytes = static_cast<std::size_t>(stack.shape.width) *
                                  static_cast<std::size_t>(stack.shape.height) *
                                  bytes_per_pixel(stack.shape.type);
  const std::vector<Run> runs = plan_decoding(stack, files, frame_bytes);
  if (runs.empty()) return Done{};
  auto made = stack.sharing.scratch != nullptr ? stack.sharing.scratch->take() : DiskFile::temporary();
  if (!made) return made.error();
  DiskFile& scratch = stack.scratch.emplace(std::move(*made));
  if (const Status room = scratch.extend(frame_bytes * stack.planes.size()); !room) return room;

  struct Worker {
    std::unique_ptr<FrameDecoder> decoder;
    int file = -1;
    std::vector<std::byte> frame;
  };
  std::vector<Worker> workers(static_cast<std::size_t>(std::max(1, threads)));
  return for_each_item(static_cast<int>(runs.size()), threads, [&](int item, int number) -> Status {
    Worker& worker = workers[static_cast<std::size_t>(number)];
    worker.frame.resize(frame_bytes);
    const Run run = runs[static_cast<std::size_t>(item)];
    for (std::size_t i = run.begin; i < run.end; ++i) {
      if (stack.sharing.give_up != nullptr && *stack.sharing.give_up) return interrupted();
      const Plane& plane = stack.planes[i];
      if (worker.file != plane.file) {
        auto decoder = open_decoder(*files[static_cast<std::size_t>(plane.file)]);
        if (!decoder) return decoder.error();
        worker.decoder = std::move(*decoder);
        worker.file = plane.file;
      }
      const Status decoded = worker.decoder->decode(plane.page, worker.frame.data());
      if (!decoded) return decoded;
      const Status put = write_pieces(scratch, plane.extents.front().offset, worker.frame);
      if (!put) return put;
      stack.count(kDecodingWork * frame_bytes);
    }
    return Done{};
  });
}

}  // namespace

Result<DiskFile> ScratchFiles::take() {
  const std::lock_guard lock(guard_);
  if (spare_.empty()) return DiskFile::temporary();
  DiskFile file = std::move(spare_.back());
  spare_.pop_back();
  return file;
}

void ScratchFiles::give_back(DiskFile file) {
  const std::lock_guard lock(guard_);
  spare_.push_back(std::move(file));
}

Result<FrameStack> open_stack(const Session& session,
                              const Series& series,
                              const std::vector<FrameFile>& files,
                              int threads,
                              StackSharing sharing) {
  auto impl = std::make_shared<FrameStack::Impl>();
  impl->shape = session.shape;
  impl->sharing = sharing;
  impl->work = reading_work(session, series, files);
  std::map<int, int> known;  // file of the session -> file of this series
  std::vector<const FrameFile*>& used = impl->files;
  std::vector<const FramePage*> pages;
  std::vector<bool> read_raw;  // aligned with used
  for (const FrameReference& frame : series.frames) {
    const auto [entry, is_new] = known.try_emplace(frame.file, static_cast<int>(used.size()));
    const FrameFile& file = files[static_cast<std::size_t>(frame.file)];
    if (is_new) {
      used.push_back(&file);
      read_raw.push_back(false);
      impl->paths.push_back(file.path);
    }
    const FramePage& page = file.pages[static_cast<std::size_t>(frame.page - 1)];
    if (!page.extents.empty()) read_raw[static_cast<std::size_t>(entry->second)] = true;
    pages.push_back(&page);
    impl->planes.push_back({entry->second, frame.page, page.extents, page.encoding, false});
  }
  impl->open_files.resize(used.size());
  const std::size_t kept = std::min(used.size(), files_kept_open(threads));
  for (std::size_t i = 0; i < kept; ++i) {
    if (!read_raw[i]) continue;
    auto file = DiskFile::open(used[i]->path);
    if (!file) return file.error();
    impl->open_files[i].emplace(std::move(*file));
  }
  impl->rows_apart = rows_of_pieces(pages, threads);
  if (impl->rows_apart > 0) {
    impl->pieces.resize(static_cast<std::size_t>(std::max(threads, 1)));
    for (PieceReader& reader : impl->pieces) reader.decoders.resize(pages.size());
    return FrameStack(std::move(impl));
  }
  if (const Status decoded = decode_to_scratch(*impl, used, threads); !decoded) return decoded.error();
  return FrameStack(std::move(impl));
}

}  // namespace evenfield
