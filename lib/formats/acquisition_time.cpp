#include "formats/acquisition_time.h"

#include <chrono>

namespace evenfield {

namespace {

/// Takes `form` off the front of `text`: '0' stands for a digit, anything else for itself.
bool take(std::string_view& text, std::string_view form) {
  if (text.size() < form.size()) return false;
  for (std::size_t i = 0; i < form.size(); ++i) {
    const bool digit = text[i] >= '0' && text[i] <= '9';
    if (form[i] == '0' ? !digit : text[i] != form[i]) return false;
  }
  text.remove_prefix(form.size());
  return true;
}

int number(std::string_view text, std::size_t at, std::size_t digits) {
  int value = 0;
  for (const char digit : text.substr(at, digits)) value = 10 * value + (digit - '0');
  return value;
}

/// `text` has the form 0000-00-00T00:00:00 with any separators.
bool is_time(std::string_view text) {
  const std::chrono::year_month_day day{std::chrono::year{number(text, 0, 4)},
                                        std::chrono::month{static_cast<unsigned>(number(text, 5, 2))},
                                        std::chrono::day{static_cast<unsigned>(number(text, 8, 2))}};
  return day.ok() && number(text, 11, 2) < 24 && number(text, 14, 2) < 60 && number(text, 17, 2) < 60;
}

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && (text.back() == ' ' || text.back() == '\0')) text.remove_suffix(1);
  while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
  return text;
}

}  // namespace

std::optional<std::string> time_from_fits(std::string_view text) {
  text = trimmed(text);
  std::string_view rest = text;
  if (!take(rest, "0000-00-00T00:00:00") || !is_time(text)) return std::nullopt;
  if (rest.starts_with(".")) {
    if (!take(rest, ".0")) return std::nullopt;
    while (take(rest, "0")) {
    }
  }
  if (rest.empty()) return std::string(text) + "Z";
  const std::string_view zone = rest;
  if (rest == "Z") return std::string(text);
  if (!take(rest, "+00:00") && !take(rest, "-00:00")) return std::nullopt;
  if (!rest.empty() || number(zone, 1, 2) > 23 || number(zone, 4, 2) > 59) return std::nullopt;
  return std::string(text);
}

std::optional<std::string> time_from_tiff(std::string_view text) {
  text = trimmed(text);
  std::string_view rest = text;
  if (!take(rest, "0000:00:00 00:00:00") || !rest.empty() || !is_time(text)) return std::nullopt;
  std::string time(text);
  time[4] = time[7] = '-';
  time[10] = 'T';
  return time + "Z";
}

}  // namespace evenfield
