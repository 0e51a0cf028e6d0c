#pragma once
/// report.html: one page for people, complete in itself (style and pictures inside, no script, no network).

#include <set>
#include <string>
#include <vector>

#include "base/error.h"
#include "result/characterization.h"

namespace evenfield {

/// A picture that was drawn, as an SVG document.
struct PagePicture {
  std::string file;  ///< plot_file() of its name and region
  std::string svg;
};

struct HtmlPage {
  std::string html;
  std::set<std::string> keys;  ///< of the template, looked up while rendering
};

/// `plot_message` is shown in place of pictures, "" if there is nothing to say. Error `output` if the
/// template asks for a key that its own level of the data does not supply: Mustache alone would leave the
/// place empty in silence.
Result<HtmlPage> html_page(const Characterization& result,
                           const std::vector<PagePicture>& pictures,
                           const std::string& plot_message);

/// The template, report.mustache as it was when the program was built.
std::string_view html_template();

}  // namespace evenfield
