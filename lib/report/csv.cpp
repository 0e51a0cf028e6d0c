#include "report/csv.h"

#include <string_view>

#include "base/text.h"
#include "result/quantity_table.h"

namespace evenfield {
namespace {

/// Builds a table cell by cell. Text is kept from acting in a spreadsheet: a cell that begins like a formula
/// gets an apostrophe in front. Numbers do not, so that they stay numbers.
class Table {
  std::string out_;
  bool row_begun_ = false;

  void put(std::string_view cell) {
    if (row_begun_) out_ += ',';
    row_begun_ = true;
    // Semicolons are quoted too: spreadsheets of some countries part cells there.
    if (cell.find_first_of(",;\"\n\r") == std::string_view::npos) {
      out_ += cell;
      return;
    }
    out_ += '"';
    for (const char c : cell) {
      if (c == '"') out_ += '"';
      out_ += c;
    }
    out_ += '"';
  }

 public:
  explicit Table(std::string_view header) : out_(std::string(header) + "\n") {}
  std::string finish() { return std::move(out_); }

  Table& text(std::string_view value) {
    std::string cell = escape_control(value);
    if (!cell.empty() && std::string_view("=+-@").find(cell.front()) != std::string_view::npos)
      cell.insert(0, "'");
    put(cell);
    return *this;
  }
  Table& texts(const std::vector<std::string>& values) {
    std::string joined;
    for (const auto& value : values) joined += (joined.empty() ? "" : ";") + value;
    return text(joined);
  }
  Table& number(const std::optional<double>& value) {
    put(value ? to_text(*value) : "");
    return *this;
  }
  Table& integer(std::int64_t value) {
    put(std::to_string(value));
    return *this;
  }
  Table& integers(const std::vector<int>& values) {
    std::string joined;
    for (const int value : values) joined += (joined.empty() ? "" : ";") + std::to_string(value);
    put(joined);
    return *this;
  }
  Table& named_numbers(const std::vector<std::pair<std::string, double>>& pairs) {
    std::string joined;
    for (const auto& [name, value] : pairs)
      joined += (joined.empty() ? "" : ";") + name + "=" + to_text(value);
    return text(joined);
  }
  void end_row() {
    out_ += '\n';
    row_begun_ = false;
  }
};

}  // namespace

std::string quantities_csv(const Characterization& result) {
  Table table(
      "name,symbol,unit,region,condition,value,standard_uncertainty,statistical_uncertainty,common_"
      "uncertainty,"
      "degrees_of_freedom,low95,high95,method,note");
  for (const Quantity& q : result.quantities) {
    const QuantityInfo* info = find_quantity(q.name);
    table.text(q.name).text(info ? info->symbol : "").text(info ? info->unit : "").text(q.region);
    table.named_numbers(q.condition).number(q.value).number(q.standard_uncertainty);
    table.number(q.statistical_uncertainty).number(q.common_uncertainty).number(q.degrees_of_freedom);
    table.number(q.low95).number(q.high95).text(q.method).text(q.note).end_row();
  }
  return table.finish();
}

std::string series_csv(const Characterization& result) {
  Table table(
      "series,kind,exposure_s,light,temperature_c,region,frames,pixels,mean_dn,mean_uncertainty_dn,variance_"
      "dn2,"
      "variance_uncertainty_dn2,saturated_fraction,flicker_percent,hits,used_in,files");
  for (std::size_t i = 0; i < result.series.size(); ++i) {
    const SeriesResult& s = result.series[i];
    table.integer(static_cast<std::int64_t>(i))
        .text(name_of(s.conditions.kind))
        .number(s.conditions.exposure_s);
    table.number(s.conditions.light).number(s.conditions.temperature_c).text(s.region).integer(s.frames);
    table.integer(s.pixels).number(s.mean_dn).number(s.mean_uncertainty_dn).number(s.variance_dn2);
    table.number(s.variance_uncertainty_dn2).number(s.saturated_fraction).number(s.flicker_percent);
    table.integer(s.hits).texts(s.used_in).texts(s.files).end_row();
  }
  return table.finish();
}

std::string findings_csv(const Characterization& result) {
  Table table("code,severity,message,series,quantities,evidence");
  for (const Finding& f : result.findings) {
    table.text(f.code).text(name_of(f.severity)).text(f.message).integers(f.series);
    table.texts(f.quantities).named_numbers(f.evidence).end_row();
  }
  return table.finish();
}

}  // namespace evenfield
