#include <filesystem>
#include <iostream>
#include <sstream>

#include "base/interrupt.h"
#include "base/text.h"
#include "commands.h"
#include "pipeline.h"
#include "progress_watch.h"
#include "report/measured_text.h"
#include "report/output_folder.h"
#include "report/report.h"
#include "result/quantity_table.h"
#include "result/result_json.h"

namespace evenfield {
namespace po = boost::program_options;
namespace {

/// The table for people: every quantity that has a value, a region at a time, then what needs attention.
void print_summary(const Characterization& result, std::ostream& out) {
  for (const Region& region : result.regions) {
    if (result.regions.size() > 1) out << "region " << escape_control(region.name) << "\n";
    for (const Quantity& q : result.quantities) {
      const QuantityInfo* info = find_quantity(q.name);
      if (q.region != region.name || info == nullptr) continue;
      const MeasuredText number = measured_text(q.value, q.standard_uncertainty, q.low95, q.high95);
      const std::string power = number.power.empty() ? "" : "e" + number.power;
      const std::string text = q.value ? number.value + power + " +- " + number.uncertainty + power +
                                             (info->unit == "1" ? "" : " " + std::string(info->unit))
                                       : "not determined: " + q.note;
      out << "  " << q.name << std::string(q.name.size() < 38 ? 38 - q.name.size() : 1, ' ') << text << "\n";
    }
  }
  for (const Finding& finding : result.findings)
    if (finding.severity != Severity::info)
      out << name_of(finding.severity) << " " << finding.code << ": " << finding.message << "\n";
}

std::vector<std::string> split(const std::string& text) {
  std::vector<std::string> out;
  std::istringstream in(text);
  for (std::string word; std::getline(in, word, ',');) out.push_back(word);
  return out;
}

}  // namespace

int measure_command(int argc, char** argv) {
  po::options_description options("Options", 100);
  options.add_options()("out", po::value<std::string>()->value_name("DIR"),
                        "folder for the results; made, or replaced if it holds results of ours")(
      "camera", po::value<std::string>()->value_name("FILE.toml"),
      "a file with [camera] and [light] that go over the session's")(
      "plots", po::value<std::string>()->value_name("none|all|NAME,...")->default_value("all"),
      "which pictures to draw");
  add_common(options);
  const Parsed parsed =
      parse(argc, argv, options, "session", "evenfield measure SESSION.toml --out DIR [options]",
            "Measures a camera from the flat and dark frames that the session file names, and writes\n"
            "result.json, CSV tables, pictures and report.html into DIR.");
  if (parsed.exit) return *parsed.exit;
  const auto refuse = [&](const std::string& what) {
    return report_error({Errc::usage, {}, "measure: " + what + "; see evenfield measure --help"});
  };
  if (!parsed.values.contains("session")) return refuse("found no session file, expected one");
  const auto sessions = parsed.values["session"].as<std::vector<std::string>>();
  if (sessions.size() > 1)
    return refuse("found " + std::to_string(sessions.size()) + " session files, expected one");
  if (!parsed.values.contains("out") || parsed.values["out"].as<std::string>().empty())
    return refuse("found no --out, expected the folder for the results");
  const auto plots = plot_selection(split(parsed.values["plots"].as<std::string>()));
  if (!plots) return report_error(plots.error());

  // The folder first: an hour of work must not end at a folder that cannot be written.
  auto folder = OutputFolder::begin(parsed.values["out"].as<std::string>());
  if (!folder) return report_error(folder.error());
  ProgressLine line(parsed.common.progress);
  MeasureOptions measure_options;
  measure_options.pictures = plots->all || !plots->names.empty();
  measure_options.threads = parsed.common.threads;
  if (parsed.values.contains("camera"))
    measure_options.camera_file = parsed.values["camera"].as<std::string>();
  Progress progress;
  measure_options.progress = &progress;
  std::optional<ProgressWatch> watch(std::in_place, line, progress);
  const auto hide = [&] {
    watch.reset();
    line.clear();
  };
  const auto result = measure(sessions.front(), measure_options);
  if (!result) {
    hide();
    return report_error(result.error());
  }
  progress.stage = "writing the report";
  const auto written = write_report(*result, folder->path(), {*plots});
  hide();
  if (!written) return report_error(written.error());
  if (interrupt_requested()) return report_error(interrupted());
  if (const Status committed = folder->commit(); !committed) return report_error(committed.error());
  if (!written->message.empty() && !parsed.common.quiet)
    std::cerr << "evenfield: " << escape_control(written->message) << "\n";
  if (parsed.common.json) {
    const auto json = to_json(*result);
    if (!json) return report_error(json.error());
    std::cout << *json;
  } else if (!parsed.common.quiet) {
    print_summary(*result, std::cout);
    std::cout << "report: "
              << escape_control(
                     (std::filesystem::path(parsed.values["out"].as<std::string>()) / "report.html").string())
              << "\n";
  }
  return output_status();
}

}  // namespace evenfield
