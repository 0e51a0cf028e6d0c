#include "base/error.h"

#include "base/text.h"

namespace evenfield {

std::string to_line(const Error& error) {
  std::string place;
  const auto add = [&place](const std::string& part) {
    if (!place.empty()) place += ", ";
    place += part;
  };
  if (!error.where.file.empty()) add(error.where.file.string());
  if (error.where.line) add("line " + std::to_string(*error.where.line));
  if (error.where.page) add("page " + std::to_string(*error.where.page));
  if (!error.where.key.empty()) add(error.where.key);
  return escape_control(place.empty() ? error.what : place + ": " + error.what);
}

int exit_status(Errc code) {
  switch (code) {
    case Errc::usage:
      return 2;
    case Errc::input:
      return 3;
    case Errc::output:
      return 5;
    case Errc::interrupted:
      return 130;
  }
  return 3;
}

}  // namespace evenfield
