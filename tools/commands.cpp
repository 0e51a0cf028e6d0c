#include "commands.h"

#include <unistd.h>

#include <boost/program_options/parsers.hpp>
#include <iostream>

#include "base/parallel.h"
#include "base/text.h"
#include "pipeline.h"

namespace evenfield {
namespace po = boost::program_options;

void add_common(po::options_description& options) {
  options.add_options()("threads", po::value<int>()->value_name("N"), "number of threads (default: all)")(
      "quiet", "no messages but errors")("json", "results on standard output as JSON")(
      "progress", po::value<std::string>()->value_name("WHEN")->default_value("auto"),
      "auto, always or never (auto: on a terminal)")("help,h", "this text")("version",
                                                                            "which version this is");
}

int output_status() {
  if (std::cout.flush()) return 0;
  return report_error({Errc::output, {}, "standard output cannot be written"});
}

Parsed parse(int argc,
             char** argv,
             const po::options_description& shown,
             const std::string& arguments,
             const std::string& usage,
             const std::string& description) {
  po::options_description options;
  options.add(shown).add_options()(arguments.c_str(), po::value<std::vector<std::string>>());
  po::positional_options_description positional;
  positional.add(arguments.c_str(), -1);
  Parsed out;
  const auto refuse = [&](const std::string& what) {
    std::cerr << "evenfield " << argv[0] << ": " << escape_control(what) << "; see evenfield " << argv[0]
              << " --help\n";
    out.exit = exit_status(Errc::usage);
    return out;
  };
  try {
    // No guessing of abbreviated options: a script must not change its meaning when options are added.
    using po::command_line_style::unix_style;
    const int style = unix_style & ~po::command_line_style::allow_guessing;
    po::store(po::command_line_parser(argc, argv).options(options).positional(positional).style(style).run(),
              out.values);
    if (out.values.contains("help")) {
      std::cout << "Usage: " << usage << "\n\n" << description << "\n\n" << shown;
      out.exit = output_status();
      return out;
    }
    if (out.values.contains("version")) {
      std::cout << "evenfield " << program_version() << "\n";
      out.exit = output_status();
      return out;
    }
    po::notify(out.values);
  } catch (const po::error& error) {
    return refuse(error.what());
  }
  out.common.quiet = out.values.contains("quiet");
  out.common.json = out.values.contains("json");
  out.common.threads = hardware_threads();
  if (out.values.contains("threads")) {
    out.common.threads = out.values["threads"].as<int>();
    if (out.common.threads < 1 || out.common.threads > 1024)
      return refuse("--threads: found " + std::to_string(out.common.threads) + ", expected 1 to 1024");
  }
  const std::string progress = out.values["progress"].as<std::string>();
  if (progress != "auto" && progress != "always" && progress != "never")
    return refuse("--progress: found '" + progress + "', expected auto, always or never");
  out.common.progress =
      progress == "always" || (progress == "auto" && !out.common.quiet && isatty(STDERR_FILENO) != 0);
  return out;
}

int report_error(const Error& error) {
  std::cerr << "evenfield: " << to_line(error) << "\n";
  return exit_status(error.code);
}

void ProgressLine::show(const std::string& text) {
  if (!shown_) return;
  std::cerr << "\r\033[K" << text << std::flush;
  dirty_ = true;
}

void ProgressLine::clear() {
  if (dirty_) std::cerr << "\r\033[K" << std::flush;
  dirty_ = false;
}

}  // namespace evenfield
