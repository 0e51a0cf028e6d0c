#pragma once
/// What went wrong and where: the one error type of the project, and the value-or-error that stages return.
/// A message is one line: file, line, page, key, then what was found and what was expected.

#include <filesystem>
#include <optional>
#include <string>
#include <utility>
#include <variant>

namespace evenfield {

/// `usage` is a wrong command line, `input` data that cannot be used, `output` something that cannot be
/// written, `interrupted` the user's wish; each has its own exit status.
enum class Errc { usage, input, output, interrupted };

struct Where {
  std::filesystem::path file;
  std::optional<int> line;  ///< from 1, of a text file
  std::optional<int> page;  ///< from 1, TIFF page or FITS extension (the primary is 1)
  std::string key;          ///< key of a text file, tag or keyword of a header
};

struct Error {
  Errc code = Errc::input;
  Where where;
  std::string what;  ///< "found ..., expected ..."
};

/// "flat.tif, page 7, BitsPerSample: found 12, expected 16"; control characters are escaped.
std::string to_line(const Error& error);

/// Exit status of the program for an error of this kind.
int exit_status(Errc code);

/// A value, or the reason why there is none. Same names as std::expected, which replaces it in C++23.
template <class T>
class [[nodiscard]] Result {
  std::variant<T, Error> state_;

 public:
  Result(T value)
      : state_(std::in_place_index<0>, std::move(value)) {}  // NOLINT(google-explicit-constructor)
  Result(Error error)
      : state_(std::in_place_index<1>, std::move(error)) {}  // NOLINT(google-explicit-constructor)
  explicit operator bool() const { return state_.index() == 0; }
  T& operator*() { return std::get<0>(state_); }
  const T& operator*() const { return std::get<0>(state_); }
  T* operator->() { return &std::get<0>(state_); }
  const T* operator->() const { return &std::get<0>(state_); }
  const Error& error() const { return std::get<1>(state_); }
};

/// Success without a value.
struct Done {};
using Status = Result<Done>;

}  // namespace evenfield
