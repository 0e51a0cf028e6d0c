#pragma once
/// The table of quantities: name, unit, symbol, sentence and source, once for program, docs and report.

#include <span>
#include <string_view>

namespace evenfield {

struct QuantityInfo {
  std::string_view name;
  std::string_view unit;  ///< as it is written behind a number: "DN/e-", "%", "" for a pure number
  std::string_view symbol;
  std::string_view title;  ///< two or three words for a table or an axis
  std::string_view sentence;
  std::string_view source;
};

/// Every quantity this version can report, in the order of reports.
std::span<const QuantityInfo> quantity_table();

/// The row of `name`, or null.
const QuantityInfo* find_quantity(std::string_view name);

}  // namespace evenfield
