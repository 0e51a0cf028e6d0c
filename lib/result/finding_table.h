#pragma once
/// The table of findings: every code the program can raise and what it means, once for program, docs and
/// report. How grave a finding is belongs to each occurrence (Finding::severity), not to its code.

#include <span>
#include <string_view>

namespace evenfield {

struct FindingInfo {
  std::string_view code;
  std::string_view title;     ///< a few words for a table
  std::string_view sentence;  ///< what was seen when this code is raised, and what it touches
  std::string_view advice;    ///< what to do about it
};

/// Every code, in the order of the documentation.
std::span<const FindingInfo> finding_table();

/// The row of `code`, or null.
const FindingInfo* find_finding(std::string_view code);

}  // namespace evenfield
