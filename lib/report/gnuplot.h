#pragma once
/// The one place that starts gnuplot.

#include <filesystem>
#include <string>

#include "base/error.h"

namespace evenfield {

/// Runs one gnuplot process on `script` with `folder` as its working directory, without start-up file and
/// without a shell. Error `output` if gnuplot is not installed, reports an error or does not end within two
/// minutes.
Status run_gnuplot(const std::string& script, const std::filesystem::path& folder);

}  // namespace evenfield
