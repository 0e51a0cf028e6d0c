#include "base/text.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <numeric>

namespace evenfield {
namespace {

/// Length of the UTF-8 sequence that starts at text[i], or 0 if there is none (overlong forms, surrogates and
/// values past U+10FFFF included).
std::size_t utf8_length(std::string_view text, std::size_t i) {
  const auto byte = [&](std::size_t k) { return static_cast<unsigned char>(text[k]); };
  const unsigned lead = byte(i);
  const std::size_t length = lead < 0x80                   ? 1
                             : lead >= 0xC2 && lead < 0xE0 ? 2
                             : lead >= 0xE0 && lead < 0xF0 ? 3
                             : lead >= 0xF0 && lead < 0xF5 ? 4
                                                           : 0;
  if (length == 0 || i + length > text.size()) return 0;
  for (std::size_t k = 1; k < length; ++k)
    if ((byte(i + k) & 0xC0U) != 0x80U) return 0;
  if (length == 3) {
    if (lead == 0xE0 && byte(i + 1) < 0xA0) return 0;
    if (lead == 0xED && byte(i + 1) > 0x9F) return 0;
  }
  if (length == 4) {
    if (lead == 0xF0 && byte(i + 1) < 0x90) return 0;
    if (lead == 0xF4 && byte(i + 1) > 0x8F) return 0;
  }
  return length;
}

std::size_t edit_distance(std::string_view a, std::string_view b) {
  std::vector<std::size_t> row(b.size() + 1);
  std::iota(row.begin(), row.end(), std::size_t{0});
  for (std::size_t i = 1; i <= a.size(); ++i) {
    std::size_t diagonal = row[0];
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t up = row[j];
      row[j] = std::min({up + 1, row[j - 1] + 1, diagonal + (a[i - 1] == b[j - 1] ? 0U : 1U)});
      diagonal = up;
    }
  }
  return row[b.size()];
}

}  // namespace

std::string to_text(double value) {
  if (std::isnan(value)) return "nan";
  std::array<char, 32> buffer{};
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value).ptr;
  return {buffer.data(), end};
}

std::string to_text(double value, int digits) {
  if (std::isnan(value)) return "nan";
  std::array<char, 64> buffer{};
  const auto end =
      std::to_chars(buffer.data(), buffer.data() + buffer.size(), value, std::chars_format::general, digits)
          .ptr;
  return {buffer.data(), end};
}

std::string escape_control(std::string_view text) {
  constexpr std::string_view kHex = "0123456789abcdef";
  std::string out;
  out.reserve(text.size());
  for (std::size_t i = 0; i < text.size();) {
    const std::size_t length = utf8_length(text, i);
    const auto first = static_cast<unsigned char>(text[i]);
    const bool c1 = length == 2 && first == 0xC2 && static_cast<unsigned char>(text[i + 1]) < 0xA0;
    if (length == 0 || first < 0x20 || first == 0x7F || c1) {
      const std::size_t bad = length == 0 ? 1 : length;
      for (std::size_t k = 0; k < bad; ++k) {
        const auto byte = static_cast<unsigned char>(text[i + k]);
        out += "\\x";
        out += kHex[byte >> 4U];
        out += kHex[byte & 15U];
      }
      i += bad;
    } else {
      out.append(text, i, length);
      i += length;
    }
  }
  return out;
}

std::vector<std::string> near_names(std::string_view name, const std::vector<std::string>& known) {
  std::vector<std::pair<std::size_t, std::string>> ranked;
  for (const std::string& candidate : known) {
    const std::size_t distance = edit_distance(name, candidate);
    if (distance <= std::max<std::size_t>(2, name.size() / 3)) ranked.emplace_back(distance, candidate);
  }
  std::stable_sort(ranked.begin(), ranked.end(),
                   [](const auto& a, const auto& b) { return a.first < b.first; });
  std::vector<std::string> out;
  for (const auto& [distance, candidate] : ranked)
    if (out.size() < 3) out.push_back(candidate);
  return out;
}

}  // namespace evenfield
