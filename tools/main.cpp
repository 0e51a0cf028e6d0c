#include <array>
#include <csignal>
#include <exception>
#include <iostream>
#include <new>
#include <string>
#include <string_view>

#include "base/interrupt.h"
#include "base/text.h"
#include "commands.h"
#include "pipeline.h"
#include "synth.h"

namespace {

using namespace evenfield;

struct Command {
  std::string_view name;
  int (*run)(int, char**);
  std::string_view sentence;
};
constexpr std::array kCommands{
    Command{"measure", measure_command, "frames in, numbers and pictures out"},
    Command{"synth", synth_command, "makes frames of a simulated camera whose truth is known"},
};

void print_help(std::ostream& out) {
  out << "Usage: evenfield COMMAND ...\n\n"
         "Characterizes scientific cameras from flat and dark frames.\n\nCommands:\n";
  for (const Command& command : kCommands)
    out << "  " << command.name << std::string(12 - command.name.size(), ' ') << command.sentence << "\n";
  out << "\n  evenfield COMMAND --help    what a command takes\n"
         "  evenfield --version         which version this is\n\n"
         "Exit status: 0 done, 2 the command line is wrong, 3 the input cannot be used, 5 the output cannot\n"
         "be written, 130 interrupted.\n";
}

extern "C" void on_signal(int) { evenfield::interrupt_requested() = true; }

int run(int argc, char** argv) {
  if (argc < 2) {
    print_help(std::cerr);
    return exit_status(Errc::usage);
  }
  const std::string_view word = argv[1];
  if (word == "--help" || word == "-h" || word == "help") {
    print_help(std::cout);
    return output_status();
  }
  if (word == "--version") {
    std::cout << "evenfield " << program_version() << "\n";
    return output_status();
  }
  for (const Command& command : kCommands)
    if (command.name == word) return command.run(argc - 1, argv + 1);
  std::vector<std::string> names;
  for (const Command& command : kCommands) names.emplace_back(command.name);
  std::string hint;
  for (const std::string& name : near_names(word, names))
    hint += (hint.empty() ? "; did you mean " : " or ") + name;
  return report_error({Errc::usage,
                       {},
                       "found the command '" + std::string(word) + "', expected measure or synth" + hint +
                           "; see evenfield --help"});
}

}  // namespace

int main(int argc, char** argv) {
  // The first signal asks the work to stop and clean up; a second one ends the program at once.
  struct sigaction action {};
  action.sa_handler = on_signal;
  action.sa_flags = static_cast<int>(SA_RESETHAND);
  for (const int signal : {SIGINT, SIGTERM, SIGHUP}) sigaction(signal, &action, nullptr);
  std::signal(
      SIGPIPE,
      SIG_IGN);  // NOLINT(bugprone-signal-handler): a closed pipe is an output error, not a silent end
  std::signal(SIGXFSZ, SIG_IGN);  // NOLINT(bugprone-signal-handler): so is a file that may not grow
  try {
    return run(argc, argv);
  } catch (const std::bad_alloc&) {
    return report_error({Errc::input, {}, "the memory of this machine is not enough for these frames"});
  } catch (const std::exception& error) {
    return report_error({Errc::input, {}, std::string("internal error: ") + error.what()});
  }
}
