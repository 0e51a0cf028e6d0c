#include "formats/tiff_handle.h"

#include <tiffio.h>

#include <array>
#include <cstdarg>
#include <cstdio>

namespace evenfield {

namespace {

constexpr std::size_t kMaxMessageText = 400;

int collect(std::string& text, const char* format, va_list arguments) {
  std::array<char, 300> line{};
  std::vsnprintf(line.data(), line.size(), format, arguments);
  if (text.size() < kMaxMessageText) text += (text.empty() ? "" : "; ") + std::string(line.data());
  return 1;  // handled: the process-wide handler, which prints, is not called
}

}  // namespace

Result<TiffHandle> TiffHandle::open(const std::filesystem::path& path,
                                    const char* mode,
                                    std::uint64_t memory_limit,
                                    Errc code) {
  TiffHandle handle;
  const std::unique_ptr<TIFFOpenOptions, void (*)(TIFFOpenOptions*)> options(TIFFOpenOptionsAlloc(),
                                                                             TIFFOpenOptionsFree);
  TIFFOpenOptionsSetMaxSingleMemAlloc(options.get(), static_cast<tmsize_t>(memory_limit));
  TIFFOpenOptionsSetErrorHandlerExtR(
      options.get(),
      [](TIFF*, void* messages, const char*, const char* format, va_list arguments) {
        return collect(static_cast<Messages*>(messages)->errors, format, arguments);
      },
      handle.messages_.get());
  TIFFOpenOptionsSetWarningHandlerExtR(
      options.get(),
      [](TIFF*, void* messages, const char*, const char* format, va_list arguments) {
        return collect(static_cast<Messages*>(messages)->warnings, format, arguments);
      },
      handle.messages_.get());
  handle.tiff_.reset(TIFFOpenExt(path.c_str(), mode, options.get()));
  if (!handle.tiff_) {
    const std::string& said = handle.errors();
    return Error{code, {path, {}, {}, {}}, said.empty() ? "libtiff cannot open it" : "damaged: " + said};
  }
  return handle;
}

void TiffHandle::forget() {
  messages_->errors.clear();
  messages_->warnings.clear();
}

void TiffHandle::Close::operator()(tiff* handle) const { TIFFClose(handle); }

}  // namespace evenfield
