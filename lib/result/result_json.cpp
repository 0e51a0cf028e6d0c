#include "result/result_json.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "base/text.h"
#include "result/quantity_table.h"

namespace evenfield {
namespace {

using Json = nlohmann::ordered_json;

// -------------------------------------------------------------------------------------------------

Json text(const std::string& value) { return escape_control(value); }
Json number(const std::optional<double>& value) { return value ? Json(*value) : Json(nullptr); }

Json texts(const std::vector<std::string>& values) {
  Json out = Json::array();
  for (const auto& value : values) out.push_back(text(value));
  return out;
}

Json named_numbers(const std::vector<std::pair<std::string, double>>& pairs) {
  Json out = Json::object();
  for (const auto& [name, value] : pairs) out[escape_control(name)] = value;
  return out;
}

Json settings(const std::vector<Setting>& pairs) {
  Json out = Json::object();
  for (const auto& [name, value] : pairs)
    out[escape_control(name)] = std::visit(
        [](const auto& v) -> Json {
          if constexpr (std::is_same_v<std::decay_t<decltype(v)>, std::string>)
            return text(v);
          else
            return v;
        },
        value);
  return out;
}

Json json_of(const Region& region) {
  return {{"name", text(region.name)},
          {"x", region.rect.x},
          {"y", region.rect.y},
          {"width", region.rect.width},
          {"height", region.rect.height}};
}

Json json_of(const Quantity& q) {
  const QuantityInfo* info = find_quantity(q.name);
  return {{"name", text(q.name)},
          {"symbol", info ? info->symbol : ""},
          {"unit", info ? info->unit : ""},
          {"region", text(q.region)},
          {"condition", named_numbers(q.condition)},
          {"value", number(q.value)},
          {"standard_uncertainty", number(q.standard_uncertainty)},
          {"statistical_uncertainty", number(q.statistical_uncertainty)},
          {"common_uncertainty", number(q.common_uncertainty)},
          {"degrees_of_freedom", number(q.degrees_of_freedom)},
          {"low95", number(q.low95)},
          {"high95", number(q.high95)},
          {"method", text(q.method)},
          {"note", text(q.note)}};
}

Json json_of(const SeriesResult& s) {
  return {{"kind", name_of(s.conditions.kind)},
          {"exposure_s", number(s.conditions.exposure_s)},
          {"light", s.conditions.light},
          {"temperature_c", number(s.conditions.temperature_c)},
          {"region", text(s.region)},
          {"frames", s.frames},
          {"pixels", s.pixels},
          {"mean_dn", s.mean_dn},
          {"mean_uncertainty_dn", s.mean_uncertainty_dn},
          {"variance_dn2", number(s.variance_dn2)},
          {"variance_uncertainty_dn2", number(s.variance_uncertainty_dn2)},
          {"saturated_fraction", s.saturated_fraction},
          {"flicker_percent", number(s.flicker_percent)},
          {"hits", s.hits},
          {"used_in", texts(s.used_in)},
          {"files", texts(s.files)}};
}

Json json_of(const Finding& f) {
  return {
      {"code", text(f.code)}, {"severity", name_of(f.severity)},   {"message", text(f.message)},
      {"series", f.series},   {"quantities", texts(f.quantities)}, {"evidence", named_numbers(f.evidence)}};
}

Json json_of(const FrameRecord& f) {
  return {{"file", text(f.file)},
          {"page", f.page},
          {"kind", name_of(f.kind)},
          {"fingerprint", text(f.fingerprint)}};
}

template <class T>
Json list_of(const std::vector<T>& values) {
  Json out = Json::array();
  for (const auto& value : values) out.push_back(json_of(value));
  return out;
}

/// JSON path of the first number that is not finite, or "".
std::string not_finite(const Json& json, const std::string& path) {
  if (json.is_number_float() && !std::isfinite(json.get<double>())) return path;
  if (!json.is_structured()) return "";
  std::size_t index = 0;
  for (const auto& [key, child] : json.items()) {
    std::string found = not_finite(child, json.is_array() ? path + "[" + std::to_string(index++) + "]"
                                                          : (path.empty() ? key : path + "." + key));
    if (!found.empty()) return found;
  }
  return "";
}

}  // namespace

Result<std::string> to_json(const Characterization& result) {
  const Json root = {
      {"schema", kResultSchema},
      {"program", {{"name", text(result.program_name)}, {"version", text(result.program_version)}}},
      {"created", text(result.created)},
      {"acquired", result.acquired ? text(*result.acquired) : Json(nullptr)},
      {"session", Json{{"file", text(result.session.file)},
                       {"camera", settings(result.session.camera)},
                       {"light", settings(result.session.light)},
                       {"analysis", settings(result.session.analysis)}}},
      {"regions", list_of(result.regions)},
      {"quantities", list_of(result.quantities)},
      {"correlations",
       Json{{"names", texts(result.correlations.names)}, {"matrix", result.correlations.matrix}}},
      {"series", list_of(result.series)},
      {"findings", list_of(result.findings)},
      {"frames", list_of(result.frames)}};
  if (const std::string path = not_finite(root, ""); !path.empty())
    return Error{Errc::output,
                 {"result.json", {}, {}, path},
                 "found a number that is not finite, expected a finite one"};

  // One record a line: short enough to read, and two results can be compared by any line tool.
  std::string out = "{";
  for (const auto& [key, value] : root.items()) {
    out += (out.size() == 1 ? "\n  " : ",\n  ") + Json(key).dump() + ": ";
    if (!value.is_array() || value.empty()) {
      out += value.dump();
      continue;
    }
    for (std::size_t i = 0; i < value.size(); ++i) out += (i == 0 ? "[\n    " : ",\n    ") + value[i].dump();
    out += "\n  ]";
  }
  return out + "\n}\n";
}

}  // namespace evenfield
