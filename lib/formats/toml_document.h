#pragma once
/// TOML files with strict reading: every key must be asked for, every error carries file, line and key, such
/// as "series[2].files[3]", where lists count from 1. A file has at most 16 MB, a key at most 16 parts, and
/// lists and inline tables at most 32 levels, so that no file can exhaust the stack.

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <variant>
#include <vector>

#include "base/error.h"

namespace evenfield {

/// Limits of a number; a value outside is an error that states them.
struct NumberRange {
  double low;             ///< may be minus infinity: no limit
  double high;            ///< may be infinity: no limit
  bool low_open = false;  ///< low itself is excluded ("greater than 0")
};

/// A single value of a document; a date or time is its text.
using TomlScalar = std::variant<std::string, double, std::int64_t, bool>;

/// One table of a TOML document. Getters remember the first error and then answer nothing, so that a reader
/// is written as a list of keys and asks once, at the end, through TomlDocument::finish(). An absent optional
/// key is no error. A key that no getter asked for is an error of finish(), with near names.
class TomlTable {
 public:
  struct State;  ///< of the whole document
  TomlTable(std::shared_ptr<State> state, const void* node, std::string path);

  bool has(std::string_view key) const;
  std::optional<std::string> text(std::string_view key);
  std::optional<std::string> one_of(std::string_view key, const std::vector<std::string>& words);
  std::optional<double> number(std::string_view key,
                               NumberRange range);  ///< integers count; nan and inf do not
  std::optional<std::int64_t> integer(std::string_view key, std::int64_t low, std::int64_t high);
  std::optional<bool> boolean(std::string_view key);
  std::optional<std::string> time(std::string_view key);  ///< an offset date-time, as RFC 3339 in UTC
  std::optional<std::vector<std::string>> texts(std::string_view key);  ///< non-empty list
  std::optional<std::vector<std::int64_t>> integers(std::string_view key, std::size_t count);
  std::optional<std::vector<double>> numbers(std::string_view key);  ///< non-empty list of finite numbers
  std::optional<TomlTable> table(std::string_view key);              ///< [key]
  std::vector<TomlTable> tables(std::string_view key);               ///< [[key]], empty when absent
  std::vector<std::string> keys() const;  ///< all keys of this table, in the order of the file
  /// The single values of this table in the order of the file, for the record; asks for none of them.
  std::vector<std::pair<std::string, TomlScalar>> scalars() const;

  void require(std::string_view key);  ///< error if absent
  /// Error at `key` (or at the table itself, if empty), in the caller's words.
  void fail(std::string_view key, std::string what);
  /// Place of `key`, for errors found later; "files[2]" is the second entry of a list. Without a key, of the
  /// table.
  Where where(std::string_view key) const;

 private:
  std::shared_ptr<State> state_;
  const void* node_;  ///< toml::table, kept out of this header
  std::string path_;  ///< e.g. "series[2]"
};

class TomlDocument {
 public:
  static Result<TomlDocument> read(const std::filesystem::path& file);
  static Result<TomlDocument> parse(std::string_view text, const std::filesystem::path& name);
  TomlTable root();
  /// The first error of any getter, else of the first key (in file order) that nobody asked for.
  Status finish() const;

 private:
  std::shared_ptr<TomlTable::State> state_;
};

}  // namespace evenfield
