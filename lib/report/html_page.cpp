#include "report/html_page.h"

#include <algorithm>
#include <kainjow/mustache.hpp>
#include <string_view>

#include "base/text.h"
#include "report/measured_text.h"
#include "report/plots.h"
#include "result/finding_table.h"
#include "result/quantity_table.h"

namespace evenfield {
namespace {

using Data = kainjow::mustache::data;
using List = kainjow::mustache::list;

/// Looks keys up in the innermost object only and keeps count. Going outward, as Mustache does, a key missing
/// in a row would show the value of the page around it.
class StrictContext : public kainjow::mustache::basic_context<std::string> {
  std::vector<const Data*> items_;
  mutable std::set<std::string> keys_, missing_;

 public:
  explicit StrictContext(const Data& root) { items_.push_back(&root); }
  void push(const Data* data) override { items_.push_back(data); }
  void pop() override { items_.pop_back(); }
  const Data* get(const std::string& name) const override {
    keys_.insert(name);
    const auto object = std::find_if(items_.rbegin(), items_.rend(),
                                     [](const Data* data) { return data && data->is_object(); });
    const Data* found = object == items_.rend() ? nullptr : (*object)->get(name);
    if (found == nullptr) missing_.insert(name);
    return found;
  }
  const Data* get_partial(const std::string& name) const override { return get(name); }
  const std::set<std::string>& keys() const { return keys_; }
  const std::set<std::string>& missing() const { return missing_; }
};

Data text(std::string_view value) { return Data(escape_control(value)); }
Data yes_if(bool value) { return Data(value ? Data::type::bool_true : Data::type::bool_false); }

Data object(std::initializer_list<std::pair<const char*, Data>> members) {
  Data out(Data::type::object);
  for (const auto& [name, value] : members) out.set(name, value);
  return out;
}

std::string joined(const std::vector<std::string>& values) {
  std::string out;
  for (const std::string& value : values) out += (out.empty() ? "" : ", ") + value;
  return out;
}

/// A hyphen that stands for minus in front of a number becomes a minus sign.
std::string with_minus(const std::string& number) {
  return number.starts_with("-") ? "\u2212" + number.substr(1) : number;
}

std::string superscript(const std::string& power) {
  constexpr std::string_view kDigits[] = {"⁰", "¹", "²", "³", "⁴", "⁵", "⁶", "⁷", "⁸", "⁹"};
  std::string out;
  for (const char c : power) out += c == '-' ? "⁻" : kDigits[c - '0'];
  return out;
}

/// "DN/e-" as it is set in print; nothing for the unit one.
std::string unit_text(std::string_view unit) {
  std::string out(unit == "1" ? "" : unit);
  for (std::size_t at = 0; (at = out.find("e-", at)) != std::string::npos; at += 4) out.replace(at, 2, "e⁻");
  return out.empty() ? "" : "\u00A0" + out;
}

std::string value_text(const MeasuredText& m, const std::string& unit) {
  if (m.value.empty()) return "not determined";
  std::string out = with_minus(m.value);
  if (!m.uncertainty.empty()) out += " ± " + m.uncertainty;
  if (!m.power.empty())
    out = (m.uncertainty.empty() ? out : "(" + out + ")") + " × 10" + superscript(m.power);
  return out + unit;
}

std::string interval_text(const MeasuredText& m) {
  const std::string power = m.power.empty() ? "" : " × 10" + superscript(m.power);
  if (m.low.empty() && m.high.empty()) return "";
  if (m.high.empty()) return "at least " + with_minus(m.low) + power;
  if (m.low.empty()) return "at most " + with_minus(m.high) + power;
  return with_minus(m.low) + " to " + with_minus(m.high) + power;
}

Data quantity_row(const Quantity& q) {
  const QuantityInfo* info = find_quantity(q.name);
  const MeasuredText m = measured_text(q.value, q.standard_uncertainty, q.low95, q.high95);
  std::string condition;
  for (const auto& [name, value] : q.condition)
    condition += (condition.empty() ? "at " : ", ") + name + " " + to_text(value);
  std::string remark;
  for (const std::string& part : {condition, q.method, q.note})
    if (!part.empty()) remark += (remark.empty() ? "" : "; ") + part;
  return object({{"quantity_title", text(info ? info->title : q.name)},
                 {"symbol", text(info ? info->symbol : "")},
                 {"value", text(value_text(m, unit_text(info ? info->unit : "")))},
                 {"interval", text(interval_text(m))},
                 {"remark", text(remark)}});
}

List region_list(const Characterization& result) {
  std::vector<std::string> names;
  for (const Region& region : result.regions) names.push_back(region.name);
  for (const Quantity& q : result.quantities)
    if (std::find(names.begin(), names.end(), q.region) == names.end()) names.push_back(q.region);
  List out;
  for (const std::string& name : names) {
    List rows, unknown;
    for (const QuantityInfo& info : quantity_table())
      for (const Quantity& q : result.quantities)
        if (q.region == name && q.name == info.name) rows.push_back(quantity_row(q));
    for (const Quantity& q : result.quantities)  // from a newer version: after those of the table
      if (q.region == name && find_quantity(q.name) == nullptr) rows.push_back(quantity_row(q));
    if (rows.empty()) continue;
    const auto region = std::find_if(result.regions.begin(), result.regions.end(),
                                     [&](const Region& r) { return r.name == name; });
    std::string title = name == "whole" && names.size() == 1 ? "Whole frame" : "Region " + name;
    if (region != result.regions.end())
      title +=
          ", " + std::to_string(region->rect.width) + " × " + std::to_string(region->rect.height) + " pixels";
    out.push_back(object({{"region_title", text(title)}, {"rows", Data(rows)}}));
  }
  return out;
}

List finding_list(const Characterization& result, bool warnings) {
  List out;
  for (const Severity severity : {Severity::problem, Severity::caution, Severity::info}) {
    if ((severity != Severity::info) != warnings) continue;
    for (const Finding& finding : result.findings) {
      if (finding.severity != severity) continue;
      const FindingInfo* info = find_finding(finding.code);
      std::vector<std::string> touched;
      for (const std::string& name : finding.quantities) {
        const QuantityInfo* quantity = find_quantity(name);
        touched.push_back(quantity ? std::string(quantity->title) + " (" + name + ")" : name);
      }
      for (const int series : finding.series) touched.push_back("series " + std::to_string(series));
      out.push_back(object({{"severity", text(name_of(severity))},
                            {"finding_title", text(info ? info->title : finding.code)},
                            {"code", text(finding.code)},
                            {"message", text(finding.message)},
                            {"has_touched", yes_if(!touched.empty())},
                            {"touched", text(joined(touched))}}));
    }
  }
  return out;
}

std::string base64(std::string_view bytes) {
  constexpr std::string_view kLetters = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
  std::string out;
  out.reserve((bytes.size() + 2) / 3 * 4);
  for (std::size_t i = 0; i < bytes.size(); i += 3) {
    const std::size_t count = std::min<std::size_t>(3, bytes.size() - i);
    unsigned group = 0;
    for (std::size_t k = 0; k < 3; ++k)
      group = group << 8U | (k < count ? static_cast<unsigned char>(bytes[i + k]) : 0U);
    for (std::size_t k = 0; k < 4; ++k) out += k <= count ? kLetters[group >> (18 - 6 * k) & 63U] : '=';
  }
  return out;
}

List figure_list(const Characterization& result, const std::vector<PagePicture>& pictures) {
  List out;
  for (std::size_t region = 0; region < result.curves.size(); ++region)
    for (const PlotInfo& info : plot_table()) {
      const std::string file = plot_file(info.name, region);
      const auto picture =
          std::find_if(pictures.begin(), pictures.end(), [&](const auto& p) { return p.file == file; });
      if (picture == pictures.end()) continue;
      const std::string where = result.curves.size() > 1 ? ", region " + result.curves[region].region : "";
      out.push_back(object({{"figure_title", text(std::string(info.title) + where)},
                            {"image", Data(base64(picture->svg))},
                            {"alternative", text("Plot: " + std::string(info.title) + where +
                                                 ". Its numbers stand in the tables.")},
                            {"reading", text(info.sentence)}}));
    }
  return out;
}

List series_list(const Characterization& result) {
  List out;
  for (std::size_t i = 0; i < result.series.size(); ++i) {
    const SeriesResult& s = result.series[i];
    const auto number = [](const std::optional<double>& value, int digits) {
      return text(value ? with_minus(to_text(*value, digits)) : "");
    };
    const auto measured = [](const std::optional<double>& value, const std::optional<double>& uncertainty) {
      return text(value ? value_text(measured_text(value, uncertainty, {}, {}), "") : "");
    };
    out.push_back(object({{"index", text(std::to_string(i))},
                          {"kind", text(name_of(s.conditions.kind))},
                          {"series_region", text(s.region)},
                          {"exposure", number(s.conditions.exposure_s, 6)},
                          {"light", number(s.conditions.light, 6)},
                          {"temperature", number(s.conditions.temperature_c, 4)},
                          {"frame_count", text(std::to_string(s.frames))},
                          {"mean", measured(s.mean_dn, s.mean_uncertainty_dn)},
                          {"variance", measured(s.variance_dn2, s.variance_uncertainty_dn2)},
                          {"saturated", number(100 * s.saturated_fraction, 3)},
                          {"flicker", number(s.flicker_percent, 2)},
                          {"hits", text(std::to_string(s.hits))},
                          {"used_in", text(joined(s.used_in))}}));
  }
  return out;
}

std::string setting_text(const Setting& setting) {
  return std::visit(
      [](const auto& value) -> std::string {
        using T = std::decay_t<decltype(value)>;
        if constexpr (std::is_same_v<T, std::string>)
          return value;
        else if constexpr (std::is_same_v<T, bool>)
          return value ? "true" : "false";
        else if constexpr (std::is_same_v<T, double>)
          return to_text(value);
        else
          return std::to_string(value);
      },
      setting.second);
}

List fact_list(const Characterization& result) {
  List out;
  const auto add = [&out](const std::string& name, const std::string& value) {
    out.push_back(object({{"fact", text(name)}, {"fact_value", text(value)}}));
  };
  add("program", result.program_name + " " + result.program_version);
  add("session file", result.session.file);
  add("frames taken", result.acquired.value_or("not recorded"));
  add("processed", result.created);
  add("frames", std::to_string(result.frames.size()));
  for (const auto& [group, settings] :
       {std::pair{"camera", &result.session.camera}, std::pair{"light", &result.session.light},
        std::pair{"analysis", &result.session.analysis}})
    for (const Setting& setting : *settings)
      add(std::string(group) + ": " + setting.first, setting_text(setting));
  return out;
}

List frame_list(const Characterization& result) {
  List out;
  for (const FrameRecord& frame : result.frames)
    out.push_back(object({{"file", text(frame.file)},
                          {"page", text(std::to_string(frame.page))},
                          {"frame_kind", text(name_of(frame.kind))},
                          {"fingerprint", text(frame.fingerprint)}}));
  return out;
}

std::string camera_name(const Characterization& result) {
  for (const char* key : {"label", "serial"})
    for (const Setting& setting : result.session.camera)
      if (setting.first == key && !setting_text(setting).empty()) return setting_text(setting);
  return result.session.file.empty() ? "camera" : result.session.file;
}

}  // namespace

Result<HtmlPage> html_page(const Characterization& result,
                           const std::vector<PagePicture>& pictures,
                           const std::string& plot_message) {
  const List warnings = finding_list(result, true), notes = finding_list(result, false);
  const std::string program = result.program_name + " " + result.program_version;
  const std::string summary =
      "Photon transfer of " + std::to_string(result.frames.size()) + " frames" +
      (result.acquired ? ", taken " + *result.acquired : "") + ". " +
      (warnings.empty()
           ? "Nothing was found that puts a number in doubt."
           : std::to_string(warnings.size()) + (warnings.size() == 1 ? " finding puts" : " findings put") +
                 " a number in doubt.");
  const Data root = object({{"program", text(program)},
                            {"title", text("Camera characterization: " + camera_name(result))},
                            {"summary", text(summary)},
                            {"has_warnings", yes_if(!warnings.empty())},
                            {"warnings", Data(warnings)},
                            {"regions", Data(region_list(result))},
                            {"has_plot_message", yes_if(!plot_message.empty())},
                            {"plot_message", text(plot_message)},
                            {"figures", Data(figure_list(result, pictures))},
                            {"has_notes", yes_if(!notes.empty())},
                            {"notes", Data(notes)},
                            {"series", Data(series_list(result))},
                            {"facts", Data(fact_list(result))},
                            {"frames_total", text(std::to_string(result.frames.size()))},
                            {"frames", Data(frame_list(result))}});
  kainjow::mustache::mustache page{std::string(html_template())};
  const auto template_error = [](const std::string& found) {
    return Error{Errc::output,
                 {"report.mustache", {}, {}, ""},
                 "found " + found + ", expected a template that its data fill"};
  };
  if (!page.is_valid()) return template_error(page.error_message());
  StrictContext context(root);
  std::string html = page.render(context);
  if (!context.missing().empty())
    return template_error("key \"" + *context.missing().begin() + "\" without data");
  return HtmlPage{std::move(html), context.keys()};
}

}  // namespace evenfield
