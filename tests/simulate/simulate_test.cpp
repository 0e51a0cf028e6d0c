#include "simulate/simulate.h"

#include <doctest/doctest.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <iterator>
#include <map>
#include <string>

#include "formats/frame_file.h"
#include "formats/toml_document.h"
#include "scenes.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;
using namespace testing;

/// A folder that is gone after the test.
struct Scratch {
  fs::path path = fs::temp_directory_path() / ("evenfield_simulate_test_" + std::to_string(::getpid()));
  Scratch() { fs::create_directories(path); }
  Scratch(const Scratch&) = delete;
  Scratch& operator=(const Scratch&) = delete;
  ~Scratch() {
    std::error_code ignored;
    fs::remove_all(path, ignored);
  }
};

std::string bytes_of(const fs::path& file) {
  std::ifstream stream(file, std::ios::binary);
  return {std::istreambuf_iterator<char>(stream), {}};
}

std::map<std::string, std::string> files_in(const fs::path& folder) {
  std::map<std::string, std::string> files;
  for (const auto& entry : fs::directory_iterator(folder))
    files[entry.path().filename().string()] = bytes_of(entry.path());
  return files;
}

/// Two flats, a dark and a bias of a camera with every effect.
Scene full_scene() {
  Scene scene = even_scene(3000.0, 72, 40);
  scene.acquired = "2026-11-24T09:30:00Z";
  scene.camera.label = "test \"camera\"\twith \\ in its name";
  scene.camera.read_noise_e = 2.0;
  scene.camera.read_noise_spread = 0.3;
  scene.camera.row_noise_e = 0.5;
  scene.camera.offset_jitter_dn = 1.0;
  scene.camera.dsnu_e = 1.0;
  scene.camera.prnu_percent = 1.0;
  scene.camera.dark_current_e_per_s = 3.0;
  scene.camera.hot_fraction = 0.01;
  scene.camera.hot_rate_e_per_s = 50.0;
  scene.light.drift_percent = 1.0;
  scene.hits = {1.0, 100.0};
  scene.amplifiers = {{"left", 0, 40, {}, {}, {}}, {"right", 40, 32, 900.0, 1.5, {}}};
  scene.amplifiers_listed = true;
  scene.series.push_back(scene.series.front());
  scene.series.back().conditions.light = 0.5;
  scene.series.back().frames = 5;
  scene.series.push_back(dark_scene().series.front());
  name_series(scene);
  return scene;
}

std::vector<std::uint16_t> decoded(const fs::path& path, int page) {
  const auto file = inspect(path);
  REQUIRE(file);
  REQUIRE(static_cast<int>(file->pages.size()) >= page);
  const FrameShape& shape = file->pages[static_cast<std::size_t>(page) - 1].shape;
  REQUIRE(shape == FrameShape{72, 40, PixelType::u16});
  auto decoder = open_decoder(*file);
  REQUIRE(decoder);
  std::vector<std::uint16_t> codes(72 * 40);
  REQUIRE((*decoder)->decode(page, codes.data()));
  return codes;
}

TEST_CASE("One and three threads write the same bytes") {
  const Scratch scratch;
  const Scene scene = full_scene();
  REQUIRE(simulate(scene, scratch.path / "one", {1, {}}));
  REQUIRE(simulate(scene, scratch.path / "three", {3, {}}));
  const auto one = files_in(scratch.path / "one");
  CHECK(one.size() == 5);
  CHECK(one == files_in(scratch.path / "three"));
}

TEST_CASE("Every format and layout holds exactly the frames that expose() makes") {
  const Scratch scratch;
  Scene scene = full_scene();
  const Sensor sensor = realize(scene);
  const SceneOutput outputs[] = {{WriteFormat::tiff, WriteCompression::none, true, false},
                                 {WriteFormat::tiff, WriteCompression::deflate, false, false},
                                 {WriteFormat::fits, WriteCompression::none, true, false},
                                 {WriteFormat::fits, WriteCompression::none, true, true},
                                 {WriteFormat::fits, WriteCompression::rice, false, false}};
  for (std::size_t index = 0; index < std::size(outputs); ++index) {
    CAPTURE(index);
    scene.output = outputs[index];
    const fs::path folder = scratch.path / std::to_string(index);
    const Status made = simulate(scene, folder, {2, {}});
    REQUIRE_MESSAGE(made, (made ? "" : to_line(made.error())));
    for (int series = 0; series < 3; ++series) {
      const SceneSeries& taken = scene.series[static_cast<std::size_t>(series)];
      const auto names = frame_file_names(scene, taken);
      REQUIRE(names.size() == static_cast<std::size_t>(scene.output.stacks ? 1 : taken.frames));
      for (int frame = 0; frame < taken.frames; ++frame) {
        const bool stacks = scene.output.stacks;
        const fs::path file = folder / names[static_cast<std::size_t>(stacks ? 0 : frame)];
        CHECK(decoded(file, stacks ? frame + 1 : 1) == expose(sensor, series, frame));
      }
    }
  }
}

TEST_CASE("The session file says what was done, in TOML") {
  const Scratch scratch;
  const Scene scene = full_scene();
  REQUIRE(simulate(scene, scratch.path / "made", {2, {}}));
  auto document = TomlDocument::read(scratch.path / "made" / "session.toml");
  REQUIRE(document);
  TomlTable root = document->root();
  CHECK(root.integer("schema", 1, 1) == 1);
  CHECK(root.time("acquired") == scene.acquired);
  auto camera = root.table("camera");
  REQUIRE(camera);
  CHECK(camera->text("label") == scene.camera.label);
  CHECK(camera->integer("bit_depth", 1, 16) == 16);
  auto regions = root.tables("region");
  REQUIRE(regions.size() == 2);
  CHECK(regions[1].text("name") == "right");
  CHECK(regions[1].integer("x", 0, 100) == 40);
  auto series = root.tables("series");
  REQUIRE(series.size() == 3);
  CHECK(series[1].number("light", {0, 1}) == 0.5);
  CHECK(series[1].texts("files") == std::vector<std::string>{"flat_02.tif"});
  CHECK(!root.has("light"));  // the scene knows no irradiance
}

TEST_CASE("A folder of ours is replaced, any other refused and left as it was") {
  const Scratch scratch;
  Scene scene = full_scene();
  const fs::path folder = scratch.path / "made";
  REQUIRE(simulate(scene, folder, {2, {}}));
  const auto before = files_in(folder);
  scene.seed = 77;
  REQUIRE(simulate(scene, folder, {2, {}}));
  CHECK(files_in(folder) != before);

  std::ofstream(folder / "note.txt") << "mine";
  const auto with_note = files_in(folder);
  const Status refused = simulate(scene, folder, {2, {}});
  REQUIRE(!refused);
  CHECK(refused.error().code == Errc::output);
  CHECK(to_line(refused.error()).find("note.txt") != std::string::npos);
  CHECK(files_in(folder) == with_note);

  const fs::path other = scratch.path / "other";
  fs::create_directory(other);
  std::ofstream(other / "truth.json") << "{\"schema\": \"something else\"}";
  const Status foreign = simulate(scene, other, {2, {}});
  REQUIRE(!foreign);
  CHECK(foreign.error().code == Errc::output);
  CHECK(files_in(other).size() == 1);

  std::ofstream(scratch.path / "file") << "mine";
  CHECK(!simulate(scene, scratch.path / "file", {2, {}}));
  CHECK(std::distance(fs::directory_iterator(scratch.path), {}) == 3);  // nothing half written is left
}

TEST_CASE("An interrupted run leaves nothing behind, and what was there stays") {
  const Scratch scratch;
  const Scene scene = full_scene();
  const auto stop_at_third = [](int done, int) { return done < 3; };
  const Status stopped = simulate(scene, scratch.path / "made", {3, stop_at_third});
  REQUIRE(!stopped);
  CHECK(stopped.error().code == Errc::interrupted);
  CHECK(fs::is_empty(scratch.path));
  REQUIRE(simulate(scene, scratch.path / "made", {3, {}}));
  const auto before = files_in(scratch.path / "made");
  CHECK(!simulate(scene, scratch.path / "made", {1, stop_at_third}));
  CHECK(files_in(scratch.path / "made") == before);
}

TEST_CASE("A folder that cannot be made is an error of output with the system's reason") {
  const Status status = simulate(full_scene(), "/proc/evenfield/made", {1, {}});
  REQUIRE(!status);
  CHECK(status.error().code == Errc::output);
  CHECK(to_line(status.error()).find("/proc/evenfield") != std::string::npos);
}

}  // namespace
}  // namespace evenfield
