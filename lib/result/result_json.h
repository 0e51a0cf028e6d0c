#pragma once
/// result.json: the one file that other programs read. Shape, names and key order are fixed in the
/// documentation; a change of meaning needs a new schema.

#include <filesystem>
#include <string>
#include <string_view>

#include "base/error.h"
#include "result/characterization.h"

namespace evenfield {

constexpr std::string_view kResultSchema = "evenfield.result/1";

/// UTF-8 text of result.json, one record a line; the same value gives the same bytes. Curves, and of a series
/// em_gain and control_v, are not part of it. Control characters and bytes that are not UTF-8 are escaped.
/// Error `output` with the JSON path where a number is not finite: JSON has no word for it.
Result<std::string> to_json(const Characterization& result);

/// The value that `text` describes; `file` serves the messages. Absent keys take the defaults of
/// Characterization and unknown ones are passed over, but the schema, the name of a quantity, the code of a
/// finding, and the kind of a series or a frame must be there. Numbers read back bit-exactly. Error `input`
/// (file, JSON path or line, found, expected) for anything else.
Result<Characterization> from_json(std::string_view text, const std::filesystem::path& file);

/// Reads a file of at most 64 MB through from_json.
Result<Characterization> read_result(const std::filesystem::path& file);

}  // namespace evenfield
