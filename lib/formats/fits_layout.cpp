#include "formats/fits_layout.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <limits>
#include <map>
#include <optional>
#include <string_view>

namespace evenfield {

namespace {

constexpr std::size_t kCard = 80;
constexpr int kMaxHeaderBlocks = 4096;  // 147456 cards
constexpr int kMaxPaddingBlocks = 10;   // as much as the tape blocks of old that held ten of these
constexpr std::size_t kMaxParts = 1'000'000;

using Block = std::array<char, kFitsBlock>;

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
  while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
  return text;
}

/// The keywords of one header that fix its size, by name; the first of each counts.
using Keywords = std::map<std::string, std::string, std::less<>>;

/// Adds the cards of `block`; true once END was seen.
bool add_cards(const Block& block, Keywords& keywords) {
  for (std::size_t at = 0; at < block.size(); at += kCard) {
    const std::string_view card(block.data() + at, kCard);
    const std::string_view name = trimmed(card.substr(0, 8));
    if (name == "END" && trimmed(card.substr(8)).empty()) return true;
    if (card.substr(8, 2) != "= ") continue;
    const bool wanted = name == "BITPIX" || name.starts_with("NAXIS") || name == "PCOUNT" ||
                        name == "GCOUNT" || name == "GROUPS" || name == "XTENSION";
    if (!wanted) continue;
    std::string_view value = card.substr(10);
    if (name != "XTENSION") value = value.substr(0, value.find('/'));
    keywords.emplace(name, trimmed(value));
  }
  return false;
}

/// Sizes of one header's data from its keywords.
class DataSize {
 public:
  DataSize(const Keywords& keywords, Where where) : keywords_(keywords), where_(std::move(where)) {}

  Result<std::uint64_t> bytes() {
    const auto bits = integer("BITPIX", std::nullopt);
    const auto axes = integer("NAXIS", std::nullopt);
    const auto parameters = integer("PCOUNT", 0);
    const auto groups = integer("GCOUNT", 1);
    for (const auto* value : {&bits, &axes, &parameters, &groups}) {
      if (!*value) return value->error();
    }
    const std::int64_t width = *bits < 0 ? -*bits : *bits;
    if (width != 8 && width != 16 && width != 32 && width != 64) {
      return wrong("BITPIX", std::to_string(*bits), "8, 16, 32, 64, -32 or -64");
    }
    if (*axes < 0 || *axes > 999) return wrong("NAXIS", std::to_string(*axes), "0 to 999");
    if (*axes == 0) return std::uint64_t{0};
    const auto grouped = keywords_.find("GROUPS");
    const bool random_groups = grouped != keywords_.end() && grouped->second == "T";
    std::uint64_t elements = 1;
    for (std::int64_t axis = 1; axis <= *axes; ++axis) {
      const std::string name = "NAXIS" + std::to_string(axis);
      const auto length = integer(name, std::nullopt);
      if (!length) return length.error();
      if (axis == 1 && *length == 0 && random_groups) return wrong("GROUPS", "T", "an image");
      if (*length < 0 || !times(elements, *length))
        return wrong(name, std::to_string(*length), "a possible size");
    }
    if (*parameters < 0) return wrong("PCOUNT", std::to_string(*parameters), "at least 0");
    if (__builtin_add_overflow(elements, static_cast<std::uint64_t>(*parameters), &elements)) {
      return wrong("PCOUNT", std::to_string(*parameters), "a possible size");
    }
    if (*groups < 0 || !times(elements, *groups) || !times(elements, width / 8) ||
        elements > static_cast<std::uint64_t>(std::numeric_limits<std::int64_t>::max() / 2)) {
      return wrong("GCOUNT", std::to_string(*groups), "a possible size");
    }
    return elements;
  }

  Result<FitsPart> part() const {
    const auto value = keywords_.find("XTENSION");
    if (value == keywords_.end()) return FitsPart::image;
    const std::string_view name = std::string_view(value->second);
    if (name.starts_with("'IMAGE")) return FitsPart::image;
    return name.starts_with("'BINTABLE") ? FitsPart::table : FitsPart::other;
  }

 private:
  static bool times(std::uint64_t& product, std::int64_t factor) {
    return !__builtin_mul_overflow(product, static_cast<std::uint64_t>(factor), &product);
  }

  Result<std::int64_t> integer(const std::string& name, std::optional<std::int64_t> absent) const {
    const auto found = keywords_.find(name);
    if (found == keywords_.end()) {
      if (absent) return *absent;
      return wrong(name, "none", "a whole number");
    }
    std::string_view text = found->second;
    if (text.starts_with("+")) text.remove_prefix(1);
    std::int64_t value = 0;
    const auto [end, failure] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (failure != std::errc{} || end != text.data() + text.size()) {
      return wrong(name, "'" + found->second + "'", "a whole number");
    }
    return value;
  }

  Error wrong(const std::string& key, const std::string& found, const std::string& expected) const {
    Where where = where_;
    where.key = key;
    return Error{Errc::input, where, "found " + found + ", expected " + expected};
  }

  const Keywords& keywords_;
  Where where_;
};

class LayoutWalk {
 public:
  LayoutWalk(const std::filesystem::path& path, const FitsStream& stream) : path_(path), stream_(stream) {}

  Result<std::vector<FitsHdu>> walk() {
    std::vector<FitsHdu> parts;
    for (;;) {
      page_ = static_cast<int>(parts.size()) + 1;
      const auto got = stream_.read(block_.data(), block_.size());
      if (!got) return got.error();
      position_ += *got;
      if (*got == 0 && !parts.empty()) return parts;
      const std::string_view mark = parts.empty() ? "SIMPLE  =" : "XTENSION=";
      const std::string_view start(block_.data(), std::min(*got, mark.size()));
      if (*got == 0 || start != mark.substr(0, start.size())) {
        if (parts.empty()) return error("", "found no FITS header, expected SIMPLE as its first keyword");
        const Status end = read_padding(*got);
        if (!end) return end.error();
        return parts;
      }
      const auto part = read_part(*got);
      if (!part) return part.error();
      if (parts.size() >= kMaxParts) return error("", "found more parts than " + std::to_string(kMaxParts));
      parts.push_back(*part);
      if (ended_) return parts;
    }
  }

 private:
  Error error(const std::string& key, const std::string& what) const {
    return Error{Errc::input, {path_, {}, page_, key}, what};
  }

  Error cut_off(std::uint64_t expected) const {
    return error(
        "", "found " + std::to_string(position_) + " bytes, expected at least " + std::to_string(expected));
  }

  /// The part whose first block, `got` bytes of it, has been read.
  Result<FitsHdu> read_part(std::size_t got) {
    Keywords keywords;
    for (int blocks = 1;; ++blocks) {
      if (got < block_.size()) return cut_off(position_ - got + block_.size());
      if (add_cards(block_, keywords)) break;
      if (blocks == kMaxHeaderBlocks) {
        return error("END",
                     "found none in " + std::to_string(blocks * kFitsBlock / kCard) + " cards, expected one");
      }
      const auto next = stream_.read(block_.data(), block_.size());
      if (!next) return next.error();
      got = *next;
      position_ += got;
    }
    DataSize size(keywords, Where{path_, {}, page_, {}});
    const auto part = size.part();
    const auto bytes = size.bytes();
    if (!bytes) return bytes.error();
    if (*bytes > stream_.most_bytes) {
      return error("NAXIS",
                   "found " + stream_.found + ", expected at least " + std::to_string(position_ + *bytes));
    }
    const FitsHdu hdu{*part, position_, *bytes};
    const std::uint64_t padded = (*bytes + kFitsBlock - 1) / kFitsBlock * kFitsBlock;
    const auto passed = stream_.skip(padded);
    if (!passed) return passed.error();
    position_ += *passed;
    if (*passed < *bytes) return cut_off(hdu.data_offset + *bytes);
    ended_ = *passed < padded;  // many writers leave the last padding out
    return hdu;
  }

  /// Behind the last part only padding may follow, and no more than a tape block of it.
  Status read_padding(std::size_t got) {
    for (int blocks = 0; got > 0; ++blocks) {
      const bool blank = std::all_of(block_.begin(), block_.begin() + static_cast<std::ptrdiff_t>(got),
                                     [](char byte) { return byte == '\0' || byte == ' '; });
      if (!blank || blocks == kMaxPaddingBlocks) {
        return error("XTENSION", std::string("found ") + (blank ? "padding without end" : "other bytes") +
                                     " behind the last part, expected an extension or the end of the file");
      }
      const auto next = stream_.read(block_.data(), block_.size());
      if (!next) return next.error();
      got = *next;
    }
    return Done{};
  }

  std::filesystem::path path_;
  const FitsStream& stream_;
  Block block_{};
  std::uint64_t position_ = 0;
  int page_ = 1;
  bool ended_ = false;
};

}  // namespace

Result<std::vector<FitsHdu>> read_fits_layout(const std::filesystem::path& path, const FitsStream& stream) {
  return LayoutWalk(path, stream).walk();
}

}  // namespace evenfield
