#include "formats/acquisition_time.h"

#include <doctest/doctest.h>

using namespace evenfield;

TEST_CASE("times of headers become RFC 3339, and what is no time is left out") {
  struct Row {
    const char* text;
    const char* expected;  // "" where there is none
  };
  // FITS Standard 4.0, section 4.4.2.1: CCYY-MM-DDThh:mm:ss[.s...].
  const Row fits[] = {{"2026-11-24T09:30:00", "2026-11-24T09:30:00Z"},
                      {"2026-11-24T09:30:00.123456", "2026-11-24T09:30:00.123456Z"},
                      {"2024-02-29T23:59:59Z  ", "2024-02-29T23:59:59Z"},
                      {"2026-11-24T09:30:00+01:00", "2026-11-24T09:30:00+01:00"},
                      {"2026-11-24", ""},
                      {"24/11/26", ""},
                      {"2026-02-29T00:00:00", ""},
                      {"2026-13-01T00:00:00", ""},
                      {"2026-11-24T24:00:00", ""},
                      {"2026-11-24T09:60:00", ""},
                      {"2026-11-24T09:30:00.", ""},
                      {"2026-11-24T09:30:00 x", ""},
                      {"", ""}};
  for (const Row& row : fits) {
    CAPTURE(std::string(row.text));
    CHECK(time_from_fits(row.text).value_or("") == row.expected);
  }
  // TIFF 6.0, section 8, DateTime.
  const Row tiff[] = {{"2026:11:24 09:30:00", "2026-11-24T09:30:00Z"},
                      {"2026-11-24 09:30:00", ""},
                      {"    :  :     :  :  ", ""},
                      {"2026:00:24 09:30:00", ""},
                      {"2026:11:24 09:30:00.5", ""}};
  for (const Row& row : tiff) {
    CAPTURE(std::string(row.text));
    CHECK(time_from_tiff(row.text).value_or("") == row.expected);
  }
}
