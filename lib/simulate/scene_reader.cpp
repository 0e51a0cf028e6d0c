#include "simulate/scene_reader.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "base/text.h"
#include "formats/toml_document.h"
#include "simulate/photons.h"

namespace evenfield {
namespace {

constexpr NumberRange kFromZero{0, 1e9};
constexpr NumberRange kAboveZero{0, 1e9, true};
constexpr NumberRange kFraction{0, 1};
constexpr NumberRange kPercent{0, 50};
constexpr std::int64_t kSmallestSide = 8;  // a session's smallest region
constexpr std::int64_t kLargestSide = 65535;
constexpr std::int64_t kLargestFrame = 100'000'000;
constexpr std::int64_t kMostFrames = 100'000;
constexpr std::int64_t kMostFramesInAll = 1'000'000;
constexpr std::size_t kMostSeries = 10'000;
constexpr double kLargestMeanE = 1e8;

/// A value that has a default.
void read_into(double& value, TomlTable& table, std::string_view key, NumberRange range) {
  value = table.number(key, range).value_or(value);
}

double required_number(TomlTable& table, std::string_view key, NumberRange range) {
  table.require(key);
  return table.number(key, range).value_or(1.0);
}

int required_integer(TomlTable& table, std::string_view key, std::int64_t low, std::int64_t high) {
  table.require(key);
  return static_cast<int>(table.integer(key, low, high).value_or(low));
}

std::uint64_t seed_of(TomlTable& table, std::uint64_t otherwise) {
  const auto seed = table.integer("seed", 0, std::numeric_limits<std::int64_t>::max());
  return seed ? static_cast<std::uint64_t>(*seed) : otherwise;
}

std::optional<std::string> some_text(TomlTable& table, std::string_view key) {
  auto text = table.text(key);
  if (text && text->empty()) table.fail(key, "found an empty string, expected some text or no such key");
  return text;
}

/// [key], an error if it is absent.
std::optional<TomlTable> required_table(TomlTable& root, std::string_view key) {
  root.require(key);
  return root.table(key);
}

void read_frame(TomlTable table, Scene& scene) {
  scene.width = required_integer(table, "width", kSmallestSide, kLargestSide);
  scene.height = required_integer(table, "height", kSmallestSide, kLargestSide);
  if (std::int64_t{scene.width} * scene.height > kLargestFrame)
    table.fail("height", "found " + std::to_string(scene.width) + " x " + std::to_string(scene.height) +
                             " pixels, expected at most " + std::to_string(kLargestFrame) + " in all");
}

double largest_code(const SceneCamera& camera) { return std::ldexp(1.0, camera.bit_depth) - 1.0; }

void read_patterns(TomlTable& table, SceneCamera& camera) {
  read_into(camera.dsnu_e, table, "dsnu_e", kFromZero);
  read_into(camera.row_pattern_e, table, "row_pattern_e", kFromZero);
  read_into(camera.column_pattern_e, table, "column_pattern_e", kFromZero);
  read_into(camera.prnu_percent, table, "prnu_percent", kPercent);
  read_into(camera.row_pattern_percent, table, "row_pattern_percent", kPercent);
  read_into(camera.column_pattern_percent, table, "column_pattern_percent", kPercent);
  read_into(camera.dark_current_e_per_s, table, "dark_current_e_per_s", kFromZero);
  read_into(camera.hot_fraction, table, "hot_fraction", kFraction);
  read_into(camera.hot_rate_e_per_s, table, "hot_rate_e_per_s", kFromZero);
  if (camera.hot_fraction > 0 && camera.hot_rate_e_per_s == 0)
    table.fail("hot_fraction",
               "found hot pixels without a rate, expected hot_rate_e_per_s above 0 beside them");
}

void read_camera(TomlTable table, Scene& scene) {
  SceneCamera& camera = scene.camera;
  camera.label = some_text(table, "label");
  camera.serial = some_text(table, "serial");
  camera.mode = some_text(table, "mode");
  camera.detector = table.one_of("detector", {"cmos", "ccd"}).value_or("cmos");
  camera.seed = seed_of(table, scene.seed);
  camera.bit_depth = required_integer(table, "bit_depth", 1, 16);
  camera.left_shift = static_cast<int>(table.integer("left_shift", 0, 15).value_or(0));
  if (camera.bit_depth + camera.left_shift > 16)
    table.fail("left_shift", "found " + std::to_string(camera.left_shift) + ", expected at most " +
                                 std::to_string(16 - camera.bit_depth) + ": " +
                                 std::to_string(camera.bit_depth) + " bits must fit into 16");
  camera.offset_dn = required_number(table, "offset_dn", {0, largest_code(camera)});
  camera.gain_dn_per_e = required_number(table, "gain_dn_per_e", kAboveZero);
  camera.full_well_e = table.number("full_well_e", kAboveZero);
  read_into(camera.curvature, table, "curvature", {0, 0.5});
  if (camera.curvature > 0 && !camera.full_well_e)
    table.fail("curvature",
               "found a curvature without full_well_e, expected both: it is the loss at full well");
  camera.read_noise_e = required_number(table, "read_noise_e", kFromZero);
  read_into(camera.read_noise_spread, table, "read_noise_spread", {0, 2});
  read_into(camera.row_noise_e, table, "row_noise_e", kFromZero);
  read_into(camera.offset_jitter_dn, table, "offset_jitter_dn", kFromZero);
  read_patterns(table, camera);
  camera.pixel_pitch_um = table.number("pixel_pitch_um", kAboveZero);
  camera.quantum_efficiency = table.number("quantum_efficiency", {0, 1, true});
}

void read_amplifier(TomlTable& table, Scene& scene) {
  SceneAmplifier amplifier;
  const int next = scene.amplifiers.empty() ? 0 : scene.amplifiers.back().x + scene.amplifiers.back().width;
  table.require("name");
  amplifier.name = some_text(table, "name").value_or("");
  const bool bad_name =
      amplifier.name == "whole" || std::any_of(amplifier.name.begin(), amplifier.name.end(), [](char c) {
        return c == '@' || c == '\x7F' || static_cast<unsigned char>(c) < 0x20;
      });
  if (bad_name)
    table.fail(
        "name",
        "found \"" + amplifier.name +
            "\", expected another name, without @ and control characters and not \"whole\", which stands "
            "for the whole frame");
  for (const SceneAmplifier& earlier : scene.amplifiers)
    if (earlier.name == amplifier.name)
      table.fail("name", "found \"" + amplifier.name + "\" a second time, expected a name of its own");
  amplifier.x = static_cast<int>(table.integer("x", 0, kLargestSide).value_or(next));
  if (amplifier.x != next)
    table.fail("x", "found " + std::to_string(amplifier.x) + ", expected " + std::to_string(next) +
                        ": amplifiers stand side by side, from left to right");
  amplifier.width = required_integer(table, "width", kSmallestSide, kLargestSide);
  amplifier.offset_dn = table.number("offset_dn", {0, largest_code(scene.camera)});
  amplifier.gain_dn_per_e = table.number("gain_dn_per_e", kAboveZero);
  amplifier.read_noise_e = table.number("read_noise_e", kFromZero);
  scene.amplifiers.push_back(std::move(amplifier));
}

void read_amplifiers(TomlTable& root, Scene& scene) {
  std::int64_t width = 0;
  for (TomlTable& table : root.tables("amplifier")) {
    read_amplifier(table, scene);
    width += scene.amplifiers.back().width;
    // Before the next one is read, and so before x + width could grow without limit.
    if (width > scene.width)
      table.fail("width", "found amplifiers of " + std::to_string(width) + " columns, expected the frame's " +
                              std::to_string(scene.width));
  }
  scene.amplifiers_listed = !scene.amplifiers.empty();
  if (!scene.amplifiers_listed)
    scene.amplifiers.push_back({"whole", 0, scene.width, {}, {}, {}});
  else if (width < scene.width)
    root.fail("amplifier", "found amplifiers of " + std::to_string(width) +
                               " columns, expected the frame's " + std::to_string(scene.width));
}

/// Electrons from irradiance or the other way, where the three numbers for it are there.
void relate_light(TomlTable& table, Scene& scene, std::optional<double> electrons_per_s) {
  SceneLight& light = scene.light;
  const auto& pitch = scene.camera.pixel_pitch_um;
  const auto& efficiency = scene.camera.quantum_efficiency;
  if (electrons_per_s && light.irradiance_w_per_m2)
    table.fail("irradiance_w_per_m2", "found it beside electrons_per_s_at_1, expected one of them");
  if (!electrons_per_s && !light.irradiance_w_per_m2)
    table.fail("", "found neither electrons_per_s_at_1 nor irradiance_w_per_m2, expected one of them");
  std::optional<double> per_irradiance;  // electrons per second for 1 W/m^2
  if (light.wavelength_nm && pitch && efficiency)
    per_irradiance = *efficiency * photons_per_s(*light.wavelength_nm, *pitch, 1.0);
  if (light.irradiance_w_per_m2) {
    if (!per_irradiance)
      table.fail(
          "irradiance_w_per_m2",
          "found it without wavelength_nm, camera.pixel_pitch_um and camera.quantum_efficiency, expected all "
          "three: electrons follow from them");
    light.electrons_per_s = *light.irradiance_w_per_m2 * per_irradiance.value_or(0.0);
  } else {
    light.electrons_per_s = electrons_per_s.value_or(0.0);
    if (per_irradiance) light.irradiance_w_per_m2 = light.electrons_per_s / *per_irradiance;
  }
}

void read_light(TomlTable table, Scene& scene) {
  SceneLight& light = scene.light;
  const auto electrons_per_s = table.number("electrons_per_s_at_1", {0, 1e15});
  light.irradiance_w_per_m2 = table.number("irradiance_w_per_m2", kFromZero);
  light.wavelength_nm = table.number("wavelength_nm", kAboveZero);
  relate_light(table, scene, electrons_per_s);
  light.irradiance_relative_standard_uncertainty =
      table.number("irradiance_relative_standard_uncertainty", kFraction);
  light.level_relative_standard_uncertainty = table.number("level_relative_standard_uncertainty", kFraction);
  read_into(light.vignetting, table, "vignetting", kFraction);
  read_into(light.drift_percent, table, "drift_percent", kPercent);
  read_into(light.trend_percent, table, "trend_percent", {-90, 100});
}

void read_hits(TomlTable table, Scene& scene) {
  read_into(scene.hits.per_frame, table, "per_frame", {0, 1e6});
  read_into(scene.hits.mean_e, table, "mean_e", kFromZero);
  if (scene.hits.per_frame > 0 && scene.hits.mean_e == 0)
    table.fail("per_frame", "found hits without a charge, expected mean_e above 0 beside it");
}

/// The numbers of `one` or of the list `many`; `otherwise` if neither is there.
std::vector<double> one_or_many(TomlTable& table,
                                std::string_view one,
                                std::string_view many,
                                std::optional<double> otherwise) {
  if (table.has(one) && table.has(many))
    table.fail(many, "found it beside " + std::string(one) + ", expected one of them");
  if (const auto value = table.number(one, kFromZero)) return {*value};
  if (const auto values = table.numbers(many)) {
    for (std::size_t i = 0; i < values->size(); ++i)
      if (!((*values)[i] >= kFromZero.low && (*values)[i] <= kFromZero.high))
        table.fail(std::string(many) + '[' + std::to_string(i + 1) + ']',
                   "found " + to_text((*values)[i]) + ", expected a number from 0 to 1000000000");
    return *values;
  }
  if (!otherwise) table.require(one);
  return {otherwise.value_or(0.0)};
}

void read_series(TomlTable table, Scene& scene) {
  SceneSeries series;
  table.require("kind");
  const std::string kind = table.one_of("kind", {"flat", "dark", "bias"}).value_or("flat");
  series.conditions.kind = kind == "flat"   ? SeriesKind::flat
                           : kind == "dark" ? SeriesKind::dark
                                            : SeriesKind::bias;
  series.frames = required_integer(table, "frames", 1, kMostFrames);
  series.conditions.temperature_c = table.number("temperature_c", {-273.15, 1000, true});

  const bool is_bias = series.conditions.kind == SeriesKind::bias;
  const auto exposures =
      one_or_many(table, "exposure_s", "exposures_s", is_bias ? std::optional(0.0) : std::nullopt);
  if (is_bias && (exposures.size() > 1 || exposures.front() != 0))
    table.fail(
        table.has("exposure_s") ? "exposure_s" : "exposures_s",
        "found an exposure above 0 or several, expected 0 or no such key: a bias is a dark of zero exposure");
  std::vector<double> lights{0.0};
  if (series.conditions.kind == SeriesKind::flat)
    lights = one_or_many(table, "light", "lights", 1.0);
  else if (table.has("light") || table.has("lights"))
    table.fail(table.has("light") ? "light" : "lights",
               "found light in a " + kind + ", expected it in flats only");
  if (exposures.size() > 1 && lights.size() > 1)
    table.fail("lights", "found it beside exposures_s, expected a list of one of them and a single other");

  for (const double exposure_s : exposures)
    for (const double light : lights) {
      series.conditions.exposure_s = exposure_s;
      series.conditions.light = light;
      const double mean_e = exposure_s * (light * scene.light.electrons_per_s +
                                          scene.camera.dark_current_e_per_s + scene.camera.hot_rate_e_per_s);
      if (mean_e > kLargestMeanE)
        table.fail("", "found a mean of " + to_text(mean_e, 4) + " electrons in a pixel, expected at most " +
                           to_text(kLargestMeanE, 4));
      scene.series.push_back(series);
    }
  if (scene.series.size() > kMostSeries)
    table.fail("", "found more than " + std::to_string(kMostSeries) + " series, expected no more");
}

void read_all_series(TomlTable& root, Scene& scene) {
  root.require("series");
  std::vector<TomlTable> tables = root.tables("series");
  if (tables.empty()) root.fail("series", "found an empty list, expected at least one [[series]]");
  for (TomlTable& table : tables) {
    if (!root.has("light") && table.one_of("kind", {"flat", "dark", "bias"}) == "flat")
      table.fail("kind", "found a flat in a scene without [light], expected that table");
    if (scene.series.size() <= kMostSeries) read_series(std::move(table), scene);
  }
  std::int64_t frames = 0;
  for (const SceneSeries& series : scene.series) frames += series.frames;
  if (frames > kMostFramesInAll)
    root.fail("series", "found " + std::to_string(frames) + " frames, expected at most " +
                            std::to_string(kMostFramesInAll) + " in all");
}

void read_output(TomlTable table, Scene& scene, std::optional<WriteFormat> format) {
  SceneOutput& output = scene.output;
  const std::string written = table.one_of("format", {"tiff", "fits"}).value_or("tiff");
  output.format = format.value_or(written == "fits" ? WriteFormat::fits : WriteFormat::tiff);
  const bool is_tiff = output.format == WriteFormat::tiff;
  output.stacks = table.boolean("stacks").value_or(true);
  const std::vector<std::pair<std::string, WriteCompression>> words =
      is_tiff
          ? std::vector<std::pair<std::string, WriteCompression>>{{"none", WriteCompression::none},
                                                                  {"deflate", WriteCompression::deflate},
                                                                  {"lzw", WriteCompression::lzw},
                                                                  {"packbits", WriteCompression::packbits}}
          : std::vector<std::pair<std::string, WriteCompression>>{{"none", WriteCompression::none},
                                                                  {"rice", WriteCompression::rice},
                                                                  {"gzip", WriteCompression::gzip}};
  std::vector<std::string> names;
  for (const auto& [name, value] : words) names.push_back(name);
  const std::string compression = table.one_of("compression", names).value_or("none");
  for (const auto& [name, value] : words)
    if (name == compression) output.compression = value;
  output.extensions = table.boolean("extensions").value_or(false);
  if (output.extensions && is_tiff)
    table.fail("extensions", "found true with format tiff, expected it with fits only");
}

Result<Scene> scene_of(TomlDocument document, std::optional<WriteFormat> format) {
  Scene scene;
  TomlTable root = document.root();
  root.require("schema");
  root.integer("schema", 1, 1);
  scene.seed = seed_of(root, 1);
  scene.acquired = root.time("acquired");
  if (auto table = required_table(root, "frame")) read_frame(std::move(*table), scene);
  if (auto table = required_table(root, "camera")) read_camera(std::move(*table), scene);
  read_amplifiers(root, scene);
  if (auto table = root.table("light")) read_light(std::move(*table), scene);
  if (auto table = root.table("hits")) read_hits(std::move(*table), scene);
  read_all_series(root, scene);
  scene.output.format = format.value_or(WriteFormat::tiff);
  if (auto table = root.table("output")) read_output(std::move(*table), scene, format);
  if (const Status status = document.finish(); !status) return status.error();
  name_series(scene);
  return scene;
}

}  // namespace

Result<Scene> read_scene(const std::filesystem::path& file, std::optional<WriteFormat> format) {
  auto document = TomlDocument::read(file);
  if (!document) return document.error();
  return scene_of(std::move(*document), format);
}

Result<Scene> read_scene_text(std::string_view text,
                              const std::filesystem::path& name,
                              std::optional<WriteFormat> format) {
  auto document = TomlDocument::parse(text, name);
  if (!document) return document.error();
  return scene_of(std::move(*document), format);
}

}  // namespace evenfield
