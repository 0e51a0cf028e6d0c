#include "report/report.h"

#include <fstream>
#include <iterator>

#include "report/csv.h"
#include "report/html_page.h"
#include "report/output_folder.h"
#include "result/result_json.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

/// Draws into folder/plots and reads the pictures back for the page. The folder exists only if it holds
/// something.
std::vector<PagePicture> draw(const Characterization& result,
                              const fs::path& folder,
                              const PlotSelection& selection,
                              std::string& message) {
  std::vector<PagePicture> pictures;
  std::error_code failed;
  const fs::path plots = folder / "plots";
  fs::create_directory(plots, failed);
  if (failed) {
    message = "No pictures: " + plots.string() + ": " + failed.message();
    return pictures;
  }
  if (const auto files = draw_plots(result, plots, selection)) {
    for (const std::string& file : *files) {
      std::ifstream stream(plots / file, std::ios::binary);
      pictures.push_back({file, {std::istreambuf_iterator<char>(stream), {}}});
    }
  } else {
    message = "No pictures: " + to_line(files.error());
  }
  if (pictures.empty()) fs::remove(plots, failed);
  return pictures;
}

}  // namespace

Result<ReportOutcome> write_report(const Characterization& result,
                                   const fs::path& folder,
                                   const ReportOptions& options) {
  const Result<std::string> json = to_json(result);
  if (!json) return json.error();
  ReportOutcome outcome;
  const std::vector<PagePicture> pictures = draw(result, folder, options.plots, outcome.message);
  const Result<HtmlPage> page = html_page(result, pictures, outcome.message);
  if (!page) return page.error();

  const std::pair<const char*, std::string> texts[] = {{"result.json", *json},
                                                       {"quantities.csv", quantities_csv(result)},
                                                       {"series.csv", series_csv(result)},
                                                       {"findings.csv", findings_csv(result)},
                                                       {"report.html", page->html}};
  for (const auto& [name, text] : texts) {
    if (const Status status = write_text_file(folder / name, text); !status) return status.error();
    outcome.files.emplace_back(name);
  }
  for (const PagePicture& picture : pictures) outcome.files.push_back(fs::path("plots") / picture.file);
  return outcome;
}

}  // namespace evenfield
