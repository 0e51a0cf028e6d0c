#include "formats/fits_handle.h"

#include <array>

namespace evenfield {

std::string fits_words(int status) {
  std::array<char, FLEN_STATUS> words{};
  fits_get_errstatus(status, words.data());
  fits_clear_errmsg();
  return std::string(words.data()) + " (CFITSIO " + std::to_string(status) + ")";
}

}  // namespace evenfield
