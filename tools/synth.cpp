#include "synth.h"

#include <filesystem>
#include <iostream>
#include <optional>
#include <string>

#include "base/interrupt.h"
#include "base/text.h"
#include "commands.h"
#include "simulate/scene_reader.h"
#include "simulate/simulate.h"

namespace evenfield {
namespace po = boost::program_options;
namespace {

constexpr const char* kUsage = "evenfield synth SCENE.toml --out DIR [options]";
constexpr const char* kDescription =
    "Makes the frames of a simulated camera whose truth is known. DIR gets the frames, session.toml for\n"
    "evenfield measure, and truth.json with what a measurement should find. The same scene makes the same\n"
    "bytes on any number of threads.";

int frames_in(const Scene& scene) {
  int frames = 0;
  for (const SceneSeries& series : scene.series) frames += series.frames;
  return frames;
}

void print_summary(const Scene& scene, const std::filesystem::path& folder, std::ostream& out) {
  out << "made " << frames_in(scene) << " frames of " << scene.width << " x " << scene.height << " pixels in "
      << scene.series.size() << " series\n"
      << "session: " << escape_control((folder / "session.toml").string()) << "\n"
      << "truth: " << escape_control((folder / "truth.json").string()) << "\n";
}

/// A string of JSON; control characters and bad UTF-8 stand escaped in it, as in all that is shown.
std::string json_text(const std::filesystem::path& path) {
  std::string out = "\"";
  for (const char c : escape_control(path.string())) {
    if (c == '"' || c == '\\') out += '\\';
    out += c;
  }
  return out + '"';
}

void print_json(const Scene& scene, const std::filesystem::path& folder, std::ostream& out) {
  out << "{\"frames\": " << frames_in(scene) << ", \"width\": " << scene.width
      << ", \"height\": " << scene.height << ", \"series\": " << scene.series.size()
      << ", \"session\": " << json_text(folder / "session.toml")
      << ", \"truth\": " << json_text(folder / "truth.json") << "}\n";
}

}  // namespace

int synth_command(int argc, char** argv) {
  po::options_description options("Options", 100);
  options.add_options()("out", po::value<std::string>()->value_name("DIR"),
                        "folder for the session; made, or replaced if it holds a simulated session of ours")(
      "format", po::value<std::string>()->value_name("tiff|fits"),
      "kind of frame files, over the scene's own");
  add_common(options);
  const Parsed parsed = parse(argc, argv, options, "scene", kUsage, kDescription);
  if (parsed.exit) return *parsed.exit;
  const auto refuse = [](const std::string& what) {
    return report_error({Errc::usage, {}, "synth: " + what + "; see evenfield synth --help"});
  };
  if (!parsed.values.contains("scene")) return refuse("found no scene file, expected SCENE.toml");
  const auto scenes = parsed.values["scene"].as<std::vector<std::string>>();
  if (scenes.size() > 1)
    return refuse("found " + std::to_string(scenes.size()) + " scene files, expected one");
  if (!parsed.values.contains("out") || parsed.values["out"].as<std::string>().empty())
    return refuse("found no --out, expected the folder for the session");
  std::optional<WriteFormat> format;
  if (parsed.values.contains("format")) {
    const auto word = parsed.values["format"].as<std::string>();
    if (word != "tiff" && word != "fits")
      return refuse("--format: found '" + word + "', expected tiff or fits");
    format = word == "tiff" ? WriteFormat::tiff : WriteFormat::fits;
  }

  const auto scene = read_scene(scenes.front(), format);
  if (!scene) return report_error(scene.error());
  const std::filesystem::path folder = parsed.values["out"].as<std::string>();
  ProgressLine line(parsed.common.progress);
  SimulateOptions simulate_options;
  simulate_options.threads = parsed.common.threads;
  simulate_options.progress = [&](int done, int of) {
    line.show("making frames: " + std::to_string(done) + " of " + std::to_string(of));
    return !interrupt_requested();
  };
  const Status made = simulate(*scene, folder, simulate_options);
  line.clear();
  if (!made) return report_error(made.error());
  if (parsed.common.json)
    print_json(*scene, folder, std::cout);
  else if (!parsed.common.quiet)
    print_summary(*scene, folder, std::cout);
  return output_status();
}

}  // namespace evenfield
