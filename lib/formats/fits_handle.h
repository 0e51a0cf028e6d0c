#pragma once
/// An open FITS file of CFITSIO. Include it in sources only: it brings CFITSIO's macros with it.
/// CFITSIO is re-entrant as long as each handle stays with one thread at a time. Its message stack is one for
/// the whole process, so that messages are built from the status code alone.

#include <fitsio.h>

#include <memory>
#include <string>

namespace evenfield {

struct CloseFits {
  void operator()(fitsfile* handle) const {
    int status = 0;
    fits_close_file(handle, &status);
    fits_clear_errmsg();
  }
};
using FitsHandle = std::unique_ptr<fitsfile, CloseFits>;

/// What `status` means, in CFITSIO's words: "END card not found (CFITSIO 210)". Empties the message stack.
std::string fits_words(int status);

}  // namespace evenfield
