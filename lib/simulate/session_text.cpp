#include "simulate/session_text.h"

#include <optional>

#include "base/text.h"

namespace evenfield {
namespace {

std::string quoted(const std::string& text) {
  constexpr const char* kHex = "0123456789ABCDEF";
  std::string out = "\"";
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    if (c == '"' || c == '\\')
      out += std::string("\\") + c;
    else if (byte < 0x20 || byte == 0x7F)
      out += std::string("\\u00") + kHex[byte >> 4U] + kHex[byte & 15U];
    else
      out += c;
  }
  return out + '"';
}

std::string line(const char* key, const std::string& value) {
  return std::string(key) + " = " + value + '\n';
}
std::string line(const char* key, double value) { return line(key, to_text(value)); }
std::string line(const char* key, int value) { return line(key, std::to_string(value)); }

std::string text_line(const char* key, const std::optional<std::string>& text) {
  return text ? line(key, quoted(*text)) : "";
}

std::string number_line(const char* key, const std::optional<double>& value) {
  return value ? line(key, *value) : "";
}

std::string camera_text(const SceneCamera& camera) {
  return "\n[camera]\n" + text_line("label", camera.label) + text_line("serial", camera.serial) +
         line("detector", quoted(camera.detector)) + text_line("mode", camera.mode) +
         line("bit_depth", camera.bit_depth) + number_line("pixel_pitch_um", camera.pixel_pitch_um);
}

/// Only what a radiometer would have told.
std::string light_text(const SceneLight& light) {
  if (!light.irradiance_w_per_m2 || !light.wavelength_nm) return "";
  return "\n[light]\n" + number_line("wavelength_nm", light.wavelength_nm) +
         number_line("irradiance_w_per_m2", light.irradiance_w_per_m2) +
         number_line("irradiance_relative_standard_uncertainty",
                     light.irradiance_relative_standard_uncertainty) +
         number_line("level_relative_standard_uncertainty", light.level_relative_standard_uncertainty);
}

std::string region_text(const SceneAmplifier& amplifier, int height) {
  return "\n[[region]]\n" + line("name", quoted(amplifier.name)) + line("x", amplifier.x) + line("y", 0) +
         line("width", amplifier.width) + line("height", height);
}

std::string series_text(const Scene& scene, const SceneSeries& series) {
  const Conditions& taken = series.conditions;
  const std::string suffix = frame_suffix(scene.output);
  return "\n[[series]]\n" + line("kind", quoted(name_of(taken.kind))) +
         number_line("exposure_s", taken.exposure_s) +
         (taken.kind == SeriesKind::flat && taken.light != 1.0 ? line("light", taken.light) : "") +
         number_line("temperature_c", taken.temperature_c) +
         line("files", "[" + quoted(series.name + (scene.output.stacks ? suffix : "_*" + suffix)) + "]");
}

}  // namespace

std::string session_text(const Scene& scene) {
  std::string text = "# Frames of a simulated camera. What is true of it stands in truth.json.\nschema = 1\n";
  if (scene.acquired) text += line("acquired", *scene.acquired);
  text += camera_text(scene.camera) + light_text(scene.light);
  if (scene.amplifiers_listed)
    for (const SceneAmplifier& amplifier : scene.amplifiers) text += region_text(amplifier, scene.height);
  for (const SceneSeries& series : scene.series) text += series_text(scene, series);
  return text;
}

}  // namespace evenfield
