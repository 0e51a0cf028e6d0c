#pragma once
/// Comma-separated tables after RFC 4180 with line ends of one newline: a header row whose names carry the
/// units, UTF-8, an empty cell for what is absent, several values in one cell joined by ';'.

#include <string>

#include "result/characterization.h"

namespace evenfield {

/// One row a quantity, in the order of the result.
std::string quantities_csv(const Characterization& result);

/// One row a series and region; the first column is the index, from 0, by which findings name it.
std::string series_csv(const Characterization& result);

/// One row a finding.
std::string findings_csv(const Characterization& result);

}  // namespace evenfield
