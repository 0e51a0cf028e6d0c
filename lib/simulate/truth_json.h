#pragma once
/// truth.json: the scene as it was read, and what its sensor and frames really are.

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "simulate/truth.h"

namespace evenfield {

constexpr const char* kTruthSchema = "evenfield.truth/1";
constexpr const char* kTruthFileName = "truth.json";
constexpr const char* kSessionFileName = "session.toml";

/// The whole file. Numbers read back bit-exactly; absent values are null; the same sensor gives the same
/// text.
std::string truth_json(const Sensor& sensor);

/// Names of all files of the session whose truth is in `file`, itself included; absent if it is not one of
/// ours.
std::optional<std::vector<std::string>> truth_files(const std::filesystem::path& file);

}  // namespace evenfield
