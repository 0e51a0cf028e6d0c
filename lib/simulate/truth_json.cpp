#include "simulate/truth_json.h"

#include <fstream>
#include <nlohmann/json.hpp>

#include "base/text.h"

namespace evenfield {
namespace {

using Json = nlohmann::ordered_json;

template <class T>
Json or_null(const std::optional<T>& value) {
  return value ? Json(*value) : Json(nullptr);
}

/// The library throws on text that is not UTF-8; TOML text always is, so this is for scenes built in memory.
Json or_null(const std::optional<std::string>& value) {
  return value ? Json(escape_control(*value)) : Json(nullptr);
}

Json camera_json(const SceneCamera& camera) {
  return {{"label", or_null(camera.label)},
          {"serial", or_null(camera.serial)},
          {"mode", or_null(camera.mode)},
          {"detector", camera.detector},
          {"seed", camera.seed},
          {"bit_depth", camera.bit_depth},
          {"left_shift", camera.left_shift},
          {"offset_dn", camera.offset_dn},
          {"gain_dn_per_e", camera.gain_dn_per_e},
          {"full_well_e", or_null(camera.full_well_e)},
          {"curvature", camera.curvature},
          {"read_noise_e", camera.read_noise_e},
          {"read_noise_spread", camera.read_noise_spread},
          {"row_noise_e", camera.row_noise_e},
          {"offset_jitter_dn", camera.offset_jitter_dn},
          {"dsnu_e", camera.dsnu_e},
          {"row_pattern_e", camera.row_pattern_e},
          {"column_pattern_e", camera.column_pattern_e},
          {"prnu_percent", camera.prnu_percent},
          {"row_pattern_percent", camera.row_pattern_percent},
          {"column_pattern_percent", camera.column_pattern_percent},
          {"dark_current_e_per_s", camera.dark_current_e_per_s},
          {"hot_fraction", camera.hot_fraction},
          {"hot_rate_e_per_s", camera.hot_rate_e_per_s},
          {"pixel_pitch_um", or_null(camera.pixel_pitch_um)},
          {"quantum_efficiency", or_null(camera.quantum_efficiency)}};
}

Json scene_json(const Scene& scene) {
  Json amplifiers = Json::array();
  if (scene.amplifiers_listed)
    for (const SceneAmplifier& one : scene.amplifiers)
      amplifiers.push_back({{"name", escape_control(one.name)},
                            {"x", one.x},
                            {"width", one.width},
                            {"offset_dn", offset_dn_of(scene, one)},
                            {"gain_dn_per_e", gain_dn_per_e_of(scene, one)},
                            {"read_noise_e", read_noise_e_of(scene, one)}});
  const SceneLight& light = scene.light;
  return {{"seed", scene.seed},
          {"acquired", or_null(scene.acquired)},
          {"frame", {{"width", scene.width}, {"height", scene.height}}},
          {"camera", camera_json(scene.camera)},
          {"amplifiers", amplifiers},
          {"light",
           {{"electrons_per_s_at_1", light.electrons_per_s},
            {"irradiance_w_per_m2", or_null(light.irradiance_w_per_m2)},
            {"wavelength_nm", or_null(light.wavelength_nm)},
            {"vignetting", light.vignetting},
            {"drift_percent", light.drift_percent},
            {"trend_percent", light.trend_percent}}},
          {"hits", {{"per_frame", scene.hits.per_frame}, {"mean_e", scene.hits.mean_e}}}};
}

Json region_json(const RegionTruth& truth, const SceneCamera& camera) {
  const auto efficiency_percent = [&](double illumination) {
    return camera.quantum_efficiency ? Json(100.0 * *camera.quantum_efficiency * illumination)
                                     : Json(nullptr);
  };
  return {{"name", escape_control(truth.name)},
          {"x", truth.rect.x},
          {"y", truth.rect.y},
          {"width", truth.rect.width},
          {"height", truth.rect.height},
          {"conversion_gain_dn_per_e", truth.conversion_gain_dn_per_e},
          {"dark_offset_dn", truth.dark_offset_dn},
          {"read_noise_dn", truth.read_noise_dn},
          {"read_noise_e", truth.read_noise_e},
          {"read_noise_median_e", truth.read_noise_median_e},
          {"row_noise_e", truth.row_noise_e},
          {"offset_jitter_dn", truth.offset_jitter_dn},
          {"dsnu_e", truth.dsnu_e},
          {"dsnu_row_e", truth.dsnu_row_e},
          {"dsnu_column_e", truth.dsnu_column_e},
          {"dsnu_pixel_e", truth.dsnu_pixel_e},
          {"prnu_percent", truth.prnu_percent},
          {"prnu_row_percent", truth.prnu_row_percent},
          {"prnu_column_percent", truth.prnu_column_percent},
          {"prnu_pixel_percent", truth.prnu_pixel_percent},
          {"prnu_with_vignetting_percent", truth.prnu_with_vignetting_percent},
          {"mean_illumination", truth.mean_illumination},
          {"quantum_efficiency_percent", efficiency_percent(1.0)},
          {"quantum_efficiency_as_lit_percent", efficiency_percent(truth.mean_illumination)},
          {"dark_current_e_per_s", truth.dark_current_e_per_s},
          {"dark_current_median_e_per_s", truth.dark_current_median_e_per_s},
          {"dark_current_spread_e_per_s", truth.dark_current_spread_e_per_s},
          {"saturation_dn", truth.saturation_dn},
          {"saturation_capacity_e", truth.saturation_capacity_e},
          {"saturation_onset_dn", or_null(truth.saturation_onset_dn)},
          {"saturation_limit", truth.saturation_limit == SaturationLimit::well ? "well" : "converter"},
          {"hot_pixel_count", truth.hot_pixel_count}};
}

Json series_json(const Sensor& sensor, const std::vector<RegionTruth>& regions, int index) {
  const SceneSeries& series = sensor.scene.series[static_cast<std::size_t>(index)];
  const SeriesTruth truth = series_truth(sensor, regions, index);
  Json signals = Json::array();
  for (std::size_t i = 0; i < regions.size(); ++i)
    signals.push_back({{"region", escape_control(regions[i].name)},
                       {"mean_photo_e", truth.mean_photo_e[i]},
                       {"mean_dark_e", truth.mean_dark_e[i]}});
  return {{"name", series.name},
          {"kind", name_of(series.conditions.kind)},
          {"exposure_s", or_null(series.conditions.exposure_s)},
          {"light", light_of(series)},
          {"temperature_c", or_null(series.conditions.temperature_c)},
          {"frames", series.frames},
          {"files", frame_file_names(sensor.scene, series)},
          {"frame_scales", truth.scales},
          {"hits", truth.hits},
          {"signals", signals}};
}

}  // namespace

std::string truth_json(const Sensor& sensor) {
  const std::vector<RegionTruth> truths = region_truths(sensor);
  Json regions = Json::array(), series = Json::array();
  for (const RegionTruth& truth : truths) regions.push_back(region_json(truth, sensor.scene.camera));
  for (int index = 0; index < static_cast<int>(sensor.scene.series.size()); ++index)
    series.push_back(series_json(sensor, truths, index));
  const Json whole = {{"schema", kTruthSchema},
                      {"scene", scene_json(sensor.scene)},
                      {"realized", {{"regions", regions}, {"series", series}}}};
  return whole.dump(1) + '\n';
}

std::optional<std::vector<std::string>> truth_files(const std::filesystem::path& file) {
  std::ifstream stream(file, std::ios::binary);
  if (!stream) return std::nullopt;
  try {
    const Json truth = Json::parse(stream);
    if (truth.at("schema") != kTruthSchema) return std::nullopt;
    std::vector<std::string> names{kTruthFileName, kSessionFileName};
    for (const Json& series : truth.at("realized").at("series"))
      for (const Json& name : series.at("files")) names.push_back(name.get<std::string>());
    return names;
  } catch (const nlohmann::json::exception&) {
    return std::nullopt;  // some other file of that name
  }
}

}  // namespace evenfield
