#include "report/measured_text.h"

#include <doctest/doctest.h>

#include <limits>

using namespace evenfield;

TEST_CASE("the uncertainty has two digits and the value ends where it ends") {
  // Rounding worked out by hand.
  struct Row {
    double value, uncertainty;
    const char *value_text, *uncertainty_text, *power;
  };
  const Row rows[] = {{0.46043, 0.0021, "0.4604", "0.0021", ""},
                      {100.031, 0.012, "100.031", "0.012", ""},
                      {7923.1, 36, "7923", "36", ""},
                      {61234, 312, "61230", "310", ""},
                      {2.5, 0.0996, "2.50", "0.10", ""},
                      {-3.21987, 0.25, "-3.22", "0.25", ""},
                      {2.18e-5, 3.1e-6, "2.18", "0.31", "-5"},
                      {1.2345e9, 2e6, "1.2345", "0.0020", "9"},
                      {0, 0.5, "0.00", "0.50", ""},
                      {0.001, 4, "0.0", "4.0", ""}};
  for (const Row& row : rows) {
    CAPTURE(row.value);
    const MeasuredText text = measured_text(row.value, row.uncertainty, {}, {});
    CHECK(text.value == row.value_text);
    CHECK(text.uncertainty == row.uncertainty_text);
    CHECK(text.power == row.power);
  }
}

TEST_CASE("without an uncertainty a value has five digits and a whole number all of its own") {
  CHECK(measured_text(3648.0, {}, {}, {}).value == "3648");
  CHECK(measured_text(1234567.0, {}, {}, {}).value == "1234567");
  CHECK(measured_text(0.123456789, {}, {}, {}).value == "0.12346");
  CHECK(measured_text(0.0, {}, {}, {}).value == "0");
}

TEST_CASE("an absent value leaves its bound") {
  const MeasuredText text = measured_text({}, {}, 52341.6, {});
  CHECK(text.value.empty());
  CHECK(text.low == "52342");
  CHECK(text.high.empty());
}

TEST_CASE("extreme and impossible numbers give finite text") {
  CHECK(measured_text(1e308, 1e-300, {}, {}).value.size() < 32);
  CHECK(measured_text(5e-324, {}, {}, {}).value.size() < 32);
  CHECK(measured_text(std::numeric_limits<double>::quiet_NaN(), 1, {}, {}).value.empty());
}
