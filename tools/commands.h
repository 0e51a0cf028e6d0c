#pragma once
/// The sub-commands, and what they share. argv[0] is the sub-command's name; the value is the exit status.

#include <boost/program_options/options_description.hpp>
#include <boost/program_options/variables_map.hpp>
#include <optional>
#include <string>
#include <vector>

#include "base/error.h"

namespace evenfield {

int measure_command(int argc, char** argv);

struct CommonOptions {
  int threads = 1;
  bool quiet = false;
  bool json = false;
  bool progress = false;  ///< resolved: show it
};

/// --threads, --quiet, --json, --progress, --help, --version.
void add_common(boost::program_options::options_description& options);

/// Parses the command line of a sub-command. A value, or an exit status after the message or help was
/// printed.
struct Parsed {
  std::optional<int> exit;
  boost::program_options::variables_map values;
  CommonOptions common;
};
/// `shown` are the options of the help; what stands without an option's name goes into `arguments`, a list of
/// strings.
Parsed parse(int argc,
             char** argv,
             const boost::program_options::options_description& shown,
             const std::string& arguments,
             const std::string& usage,
             const std::string& description);

/// 0, or that of an output error, with its message, if standard output could not be written.
int output_status();

/// One line on standard error, "evenfield: ...", and the exit status of the error.
int report_error(const Error& error);

/// What stands on a terminal while the work goes on; nothing is printed unless it was asked for.
class ProgressLine {
 public:
  explicit ProgressLine(bool shown) : shown_(shown) {}
  ~ProgressLine() { clear(); }
  ProgressLine(const ProgressLine&) = delete;
  ProgressLine& operator=(const ProgressLine&) = delete;
  bool shown() const { return shown_; }
  void show(const std::string& text);
  void clear();

 private:
  bool shown_;
  bool dirty_ = false;
};

}  // namespace evenfield
