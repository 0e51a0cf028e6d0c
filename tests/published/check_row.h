#pragma once
/// A row of a table of checks: what the library computes beside what is expected, with the source's mark.

#include <doctest/doctest.h>

#include <cmath>
#include <span>

/// Where an expected value comes from.
enum class Mark {
  published,      ///< printed in the named source and seen there
  via_secondary,  ///< printed in the named source, seen in a text that quotes it
  derived,        ///< closed form or exact arithmetic of our own
  from_memory,    ///< recalled from the named source, not seen
  reproduced      ///< recalled from the named source, not seen, and computed again from the same data
};

constexpr const char* name_of(Mark mark) {
  switch (mark) {
    case Mark::published:
      return "published";
    case Mark::via_secondary:
      return "published, via secondary text";
    case Mark::derived:
      return "derived";
    case Mark::from_memory:
      return "from memory";
    case Mark::reproduced:
      return "from memory, reproduced from the data";
  }
  return "";
}

struct CheckRow {
  const char* id;
  const char* quantity;
  double computed;
  double expected;
  double tolerance;  ///< absolute
  Mark mark;
  const char* source;
};

inline double relative(double tolerance, double expected) { return tolerance * std::abs(expected); }

inline void check_rows(std::span<const CheckRow> rows) {
  for (const CheckRow& row : rows) {
    INFO(row.id << ", " << row.quantity << " (" << name_of(row.mark) << ": " << row.source << "): found "
                << row.computed << ", expected " << row.expected << " within " << row.tolerance);
    CHECK(std::abs(row.computed - row.expected) <= row.tolerance);
  }
}
