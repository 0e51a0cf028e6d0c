#include <algorithm>
#include <fstream>
#include <limits>
#include <nlohmann/json.hpp>
#include <utility>

#include "base/text.h"
#include "result/result_json.h"

namespace evenfield {
namespace {

using Json = nlohmann::ordered_json;

constexpr std::size_t kLargestFile = 64U << 20U;  // some 400 000 frames; a larger file is not one of ours
constexpr int kDeepest = 16;                      // the schema nests four deep

// -------------------------------------------------------------------------------------------------

const char* type_of(const Json& json) {
  if (json.is_null()) return "null";
  if (json.is_boolean()) return "a boolean";
  if (json.is_number()) return "a number";
  if (json.is_string()) return "a text";
  return json.is_array() ? "a list" : "an object";
}

/// One value of the tree with its path. The first thing that does not fit is kept as the error and everything
/// after it reads as a default, so that the code that reads a record stays a list of its fields.
class Node {
  const Json* json_;  // null: absent
  std::string path_;
  std::optional<Error>* error_;

 public:
  Node(const Json* json, std::string path, std::optional<Error>* error)
      : json_(json), path_(std::move(path)), error_(error) {}

  void refuse(const std::string& found, const std::string& expected) const {
    if (!*error_)
      *error_ = Error{Errc::input, {{}, {}, {}, path_}, "found " + found + ", expected " + expected};
  }
  bool present() const { return json_ != nullptr && !json_->is_null(); }

  Node at(const char* key, bool required = false) const {
    const Json* child = nullptr;
    if (json_ != nullptr && json_->is_object()) {
      if (const auto it = json_->find(key); it != json_->end()) child = &*it;
    } else if (present()) {
      refuse(type_of(*json_), "an object");
    }
    Node node(child, path_.empty() ? key : path_ + "." + key, error_);
    if (required && !node.present()) node.refuse("nothing", "a text");
    return node;
  }

  template <class Use>
  void each(Use use) const {
    if (!present()) return;
    if (!json_->is_array()) return refuse(type_of(*json_), "a list");
    for (std::size_t i = 0; i < json_->size() && !*error_; ++i)
      use(Node(&(*json_)[i], path_ + "[" + std::to_string(i) + "]", error_));
  }
  template <class Use>
  void each_member(Use use) const {
    if (!present()) return;
    if (!json_->is_object()) return refuse(type_of(*json_), "an object");
    for (const auto& [key, child] : json_->items())
      if (!*error_) use(escape_control(key), Node(&child, path_ + "." + key, error_));
  }

  void read(std::string& out) const {
    if (!present()) return;
    if (!json_->is_string()) return refuse(type_of(*json_), "a text");
    out = escape_control(json_->get_ref<const std::string&>());
  }
  void read(double& out) const {
    if (!present()) return;
    if (!json_->is_number()) return refuse(type_of(*json_), "a number");
    out = json_->get<double>();
  }
  template <std::signed_integral T>
  void read(T& out) const {
    if (!present()) return;
    const bool fits = json_->is_number_unsigned()
                          ? std::cmp_less_equal(json_->get<std::uint64_t>(), std::numeric_limits<T>::max())
                          : json_->is_number_integer() && std::in_range<T>(json_->get<std::int64_t>());
    if (!fits) return refuse(json_->is_number() ? json_->dump() : type_of(*json_), "a whole number in range");
    out = json_->get<T>();
  }
  template <class T>
  void read(std::optional<T>& out) const {
    if (!present()) return;
    T value{};
    read(value);
    out = std::move(value);
  }
  void read(std::vector<std::pair<std::string, double>>& out) const {
    each_member([&](std::string key, const Node& node) {
      double value = 0;
      if (!node.present()) node.refuse("null", "a number");
      node.read(value);
      out.emplace_back(std::move(key), value);
    });
  }
  void read(std::vector<Setting>& out) const {
    each_member([&](std::string key, const Node& node) {
      const Json& json = *node.json_;
      if (json.is_boolean()) return void(out.emplace_back(std::move(key), json.get<bool>()));
      if (json.is_number_integer()) {
        std::int64_t value = 0;
        node.read(value);
        return void(out.emplace_back(std::move(key), value));
      }
      if (json.is_number()) return void(out.emplace_back(std::move(key), json.get<double>()));
      if (!json.is_string()) return node.refuse(type_of(json), "a text, a number or a boolean");
      std::string value;
      node.read(value);
      out.emplace_back(std::move(key), std::move(value));
    });
  }
  template <class T>
  void read(std::vector<T>& out) const {
    each([&](const Node& node) {
      if (!node.present()) node.refuse("null", "a value");
      T value{};
      if constexpr (requires { read_record(node, value); })
        read_record(node, value);
      else
        node.read(value);
      out.push_back(std::move(value));
    });
  }
  /// One of the words that name the enumerators of `known`.
  template <class Enum>
  void read_word(Enum& out, std::initializer_list<Enum> known) const {
    std::string word;
    read(word);
    if (*error_ || word.empty()) return;
    std::string expected;
    for (const Enum value : known) {
      if (word == name_of(value)) return void(out = value);
      expected += (expected.empty() ? "" : ", ") + std::string(name_of(value));
    }
    refuse("\"" + word + "\"", "one of " + expected);
  }
};

constexpr auto kKinds = {SeriesKind::flat, SeriesKind::dark, SeriesKind::bias};

void read_record(const Node& node, Region& out) {
  node.at("name").read(out.name);
  node.at("x").read(out.rect.x);
  node.at("y").read(out.rect.y);
  node.at("width").read(out.rect.width);
  node.at("height").read(out.rect.height);
}

void read_record(const Node& node, Quantity& out) {
  out.region = "whole";
  node.at("name", true).read(out.name);
  node.at("region").read(out.region);
  node.at("condition").read(out.condition);
  node.at("value").read(out.value);
  node.at("standard_uncertainty").read(out.standard_uncertainty);
  node.at("statistical_uncertainty").read(out.statistical_uncertainty);
  node.at("common_uncertainty").read(out.common_uncertainty);
  node.at("degrees_of_freedom").read(out.degrees_of_freedom);
  node.at("low95").read(out.low95);
  node.at("high95").read(out.high95);
  node.at("method").read(out.method);
  node.at("note").read(out.note);
}

void read_record(const Node& node, SeriesResult& out) {
  out.region = "whole";
  node.at("kind", true).read_word(out.conditions.kind, kKinds);
  node.at("exposure_s").read(out.conditions.exposure_s);
  node.at("light").read(out.conditions.light);
  node.at("temperature_c").read(out.conditions.temperature_c);
  node.at("region").read(out.region);
  node.at("frames").read(out.frames);
  node.at("pixels").read(out.pixels);
  node.at("mean_dn").read(out.mean_dn);
  node.at("mean_uncertainty_dn").read(out.mean_uncertainty_dn);
  node.at("variance_dn2").read(out.variance_dn2);
  node.at("variance_uncertainty_dn2").read(out.variance_uncertainty_dn2);
  node.at("saturated_fraction").read(out.saturated_fraction);
  node.at("flicker_percent").read(out.flicker_percent);
  node.at("hits").read(out.hits);
  node.at("used_in").read(out.used_in);
  node.at("files").read(out.files);
}

void read_record(const Node& node, Finding& out) {
  node.at("code", true).read(out.code);
  node.at("severity").read_word(out.severity, {Severity::info, Severity::caution, Severity::problem});
  node.at("message").read(out.message);
  node.at("series").read(out.series);
  node.at("quantities").read(out.quantities);
  node.at("evidence").read(out.evidence);
}

void read_record(const Node& node, FrameRecord& out) {
  node.at("file").read(out.file);
  node.at("page").read(out.page);
  node.at("kind", true).read_word(out.kind, kKinds);
  node.at("fingerprint").read(out.fingerprint);
}

Characterization read_characterization(const Node& root) {
  Characterization out;
  std::string schema;
  root.at("schema", true).read(schema);
  if (schema != kResultSchema)
    root.at("schema").refuse("\"" + schema + "\"", "\"" + std::string(kResultSchema) + "\"");
  root.at("program").at("name").read(out.program_name);
  root.at("program").at("version").read(out.program_version);
  root.at("created").read(out.created);
  root.at("acquired").read(out.acquired);
  const Node session = root.at("session");
  session.at("file").read(out.session.file);
  session.at("camera").read(out.session.camera);
  session.at("light").read(out.session.light);
  session.at("analysis").read(out.session.analysis);
  root.at("regions").read(out.regions);
  root.at("quantities").read(out.quantities);
  const Node correlations = root.at("correlations");
  correlations.at("names").read(out.correlations.names);
  correlations.at("matrix").each([&](const Node& row) { row.read(out.correlations.matrix.emplace_back()); });
  const std::size_t size = out.correlations.names.size();
  const auto fits = [size](const std::vector<double>& row) { return row.size() == size; };
  if (out.correlations.matrix.size() != size ||
      !std::all_of(out.correlations.matrix.begin(), out.correlations.matrix.end(), fits))
    correlations.at("matrix").refuse("another shape", "a row and a column for each of names");
  root.at("series").read(out.series);
  root.at("findings").read(out.findings);
  root.at("frames").read(out.frames);
  return out;
}

int depth_of(std::string_view text) {
  int depth = 0, deepest = 0;
  bool quoted = false;
  for (std::size_t i = 0; i < text.size(); ++i) {
    const char c = text[i];
    if (quoted && c == '\\')
      ++i;
    else if (c == '"')
      quoted = !quoted;
    else if (!quoted && (c == '[' || c == '{'))
      deepest = std::max(deepest, ++depth);
    else if (!quoted && (c == ']' || c == '}'))
      --depth;
  }
  return deepest;
}

Error size_error(const std::filesystem::path& file, std::uintmax_t found) {
  return {Errc::input,
          {file, {}, {}, ""},
          "found " + std::to_string(found) + " bytes, expected at most " + std::to_string(kLargestFile) +
              " in a result"};
}

}  // namespace

Result<Characterization> from_json(std::string_view text, const std::filesystem::path& file) {
  if (text.size() > kLargestFile) return size_error(file, text.size());
  if (depth_of(text) > kDeepest)
    return Error{Errc::input,
                 {file, {}, {}, ""},
                 "found deeper nesting, expected at most " + std::to_string(kDeepest) + " levels of JSON"};
  Json root;
  try {
    root = Json::parse(text);
  } catch (const Json::parse_error& error) {
    const std::string_view before = text.substr(0, std::min(error.byte, text.size()));
    const int line = 1 + static_cast<int>(std::count(before.begin(), before.end(), '\n'));
    return Error{
        Errc::input, {file, line, {}, ""}, "found text that is not JSON, expected a result of this program"};
  } catch (const Json::exception&) {
    return Error{
        Errc::input, {file, {}, {}, ""}, "found a number too large to represent, expected a finite one"};
  }
  std::optional<Error> error;
  const Node node(&root, "", &error);
  if (!root.is_object()) node.refuse(type_of(root), "an object");
  Characterization out = read_characterization(node);
  if (!error) return out;
  error->where.file = file;
  return *error;
}

Result<Characterization> read_result(const std::filesystem::path& file) {
  std::error_code failed;
  const auto status = std::filesystem::status(file, failed);
  if (!std::filesystem::exists(status))
    return Error{Errc::input, {file, {}, {}, ""}, "found no such file, expected a result"};
  if (!std::filesystem::is_regular_file(status))
    return Error{Errc::input, {file, {}, {}, ""}, "found no regular file, expected a result"};
  const auto size = std::filesystem::file_size(file, failed);
  if (!failed && size > kLargestFile) return size_error(file, size);
  std::ifstream stream(file, std::ios::binary);
  std::string text(failed ? 0 : static_cast<std::size_t>(size), '\0');
  stream.read(text.data(), static_cast<std::streamsize>(text.size()));
  if (!stream || failed)
    return Error{Errc::input, {file, {}, {}, ""}, "found a file that cannot be read, expected a result"};
  return from_json(text, file);
}

}  // namespace evenfield
