#include "simulate/scene_reader.h"

#include <doctest/doctest.h>

#include <string>

namespace evenfield {
namespace {

const std::string kScene = R"(schema = 1
seed = 5
[frame]
width = 64
height = 48
[camera]
bit_depth = 12
offset_dn = 100
gain_dn_per_e = 0.5
read_noise_e = 2.0
[light]
electrons_per_s_at_1 = 1e5
[[series]]
kind = "flat"
exposure_s = 0.01
frames = 2
[[series]]
kind = "bias"
frames = 4
)";

std::string changed(const std::string& old, const std::string& with) {
  std::string text = kScene;
  const std::size_t at = text.find(old);
  REQUIRE(at != std::string::npos);
  return text.replace(at, old.size(), with);
}

std::string error_of(const std::string& text) {
  const auto scene = read_scene_text(text, "scene.toml");
  return scene ? "no error" : to_line(scene.error());
}

TEST_CASE("A short scene is read, and what it leaves out has its default") {
  const auto scene = read_scene_text(kScene, "scene.toml");
  REQUIRE(scene);
  CHECK(scene->seed == 5);
  CHECK(scene->camera.seed == 5);
  CHECK(scene->camera.dsnu_e == 0.0);
  CHECK(!scene->camera.full_well_e);
  REQUIRE(scene->amplifiers.size() == 1);
  CHECK(scene->amplifiers.front().width == 64);
  CHECK(!scene->amplifiers_listed);
  REQUIRE(scene->series.size() == 2);
  CHECK(scene->series[0].name == "flat_01");
  CHECK(scene->series[0].conditions.light == 1.0);
  CHECK(scene->series[1].name == "bias_01");
  CHECK(scene->series[1].conditions.exposure_s == 0.0);
  CHECK(scene->output.format == WriteFormat::tiff);
}

TEST_CASE("Lists of exposures or lights make a series each") {
  const auto exposures =
      read_scene_text(changed("exposure_s = 0.01", "exposures_s = [0.01, 0.02, 0.04]"), "scene.toml");
  REQUIRE(exposures);
  REQUIRE(exposures->series.size() == 4);
  CHECK(exposures->series[2].name == "flat_03");
  CHECK(exposures->series[2].conditions.exposure_s == 0.04);
  const auto lights = read_scene_text(changed("frames = 2", "frames = 2\nlights = [0.5, 1]"), "scene.toml");
  REQUIRE(lights);
  REQUIRE(lights->series.size() == 3);
  CHECK(lights->series[0].conditions.light == 0.5);
}

TEST_CASE("Electrons and irradiance follow from one another") {
  // Photon energy h c / wavelength at 500 nm: 6.62607015e-34 x 299792458 / 5e-7 = 3.97289e-19 J; 1e-3 W/m^2
  // on (10 um)^2 are 1e-13 W or 251706 photons per second; at 0.8 electrons a photon 201365 e-/s.
  const std::string camera =
      changed("read_noise_e = 2.0", "read_noise_e = 2.0\npixel_pitch_um = 10\nquantum_efficiency = 0.8");
  const std::string old = "electrons_per_s_at_1 = 1e5";
  std::string text = camera;
  text.replace(text.find(old), old.size(), "irradiance_w_per_m2 = 1e-3\nwavelength_nm = 500");
  const auto lit = read_scene_text(text, "scene.toml");
  REQUIRE(lit);
  CHECK(lit->light.electrons_per_s == doctest::Approx(201365).epsilon(1e-5));
  text = camera;
  text.replace(text.find(old), old.size(), "electrons_per_s_at_1 = 201365\nwavelength_nm = 500");
  const auto back = read_scene_text(text, "scene.toml");
  REQUIRE(back);
  REQUIRE(back->light.irradiance_w_per_m2);
  CHECK(*back->light.irradiance_w_per_m2 == doctest::Approx(1e-3).epsilon(1e-5));
}

TEST_CASE("The format asked for takes the place of the scene's, and its compressions with it") {
  const auto scene =
      read_scene_text(kScene + "[output]\nformat = \"tiff\"\n", "scene.toml", WriteFormat::fits);
  REQUIRE(scene);
  CHECK(scene->output.format == WriteFormat::fits);
  CHECK(!read_scene_text(kScene + "[output]\ncompression = \"lzw\"\n", "scene.toml", WriteFormat::fits));
}

TEST_CASE("A bad scene is one line with file, line and key, what was found and what was expected") {
  struct Row {
    std::string text, place, found;
  };
  const std::string amplifier = "[[amplifier]]\nname = \"a\"\nwidth = 32\n";
  const Row rows[] = {
      {changed("seed = 5", "sede = 5"), "line 2, sede", "seed"},
      {changed("schema = 1\n", ""), "schema", "found no such key"},
      {changed("schema = 1", "schema = 2"), "line 1, schema", "found 2, expected 1"},
      {changed("seed = 5", "seed = -1"), "line 2, seed", "found -1, expected an integer from 0"},
      {changed("width = 64", "width = 7"), "frame.width", "from 8 to 65535"},
      {changed("width = 64\nheight = 48", "width = 20000\nheight = 20000"), "frame.height",
       "found 20000 x 20000"},
      {changed("[frame]\nwidth = 64\nheight = 48\n", ""), "frame", "found no such key"},
      {changed("bit_depth = 12", "bit_depth = 17"), "camera.bit_depth", "from 1 to 16"},
      {changed("bit_depth = 12", "bit_depth = 12\nleft_shift = 5"), "camera.left_shift",
       "found 5, expected at most 4"},
      {changed("offset_dn = 100", "offset_dn = 5000"), "camera.offset_dn", "to 4095"},
      {changed("gain_dn_per_e = 0.5", "gain_dn_per_e = 0"), "camera.gain_dn_per_e", "greater than 0"},
      {changed("read_noise_e = 2.0", "read_noise_e = -2.0"), "camera.read_noise_e",
       "found -2, expected a number from 0"},
      {changed("read_noise_e = 2.0", "read_noise_e = nan"), "camera.read_noise_e", "nan"},
      {changed("read_noise_e = 2.0", "read_noise_e = 2.0\ncurvature = 0.1"), "camera.curvature",
       "full_well_e"},
      {changed("read_noise_e = 2.0", "read_noise_e = 2.0\nhot_fraction = 0.1"), "camera.hot_fraction",
       "hot_rate_e_per_s"},
      {changed("electrons_per_s_at_1 = 1e5", "vignetting = 0"), "light", "found neither"},
      {changed("electrons_per_s_at_1 = 1e5", "electrons_per_s_at_1 = 1e5\nirradiance_w_per_m2 = 1"),
       "light.irradiance_w_per_m2", "expected one of them"},
      {changed("electrons_per_s_at_1 = 1e5", "irradiance_w_per_m2 = 1"), "light.irradiance_w_per_m2",
       "wavelength_nm"},
      {changed("electrons_per_s_at_1 = 1e5", "electrons_per_s_at_1 = 1e5\nvignetting = 1.5"),
       "light.vignetting", "1.5"},
      {changed("[light]\nelectrons_per_s_at_1 = 1e5\n", ""), "series[1].kind", "without [light]"},
      {changed("electrons_per_s_at_1 = 1e5", "electrons_per_s_at_1 = 1e12"), "series[1]",
       "electrons in a pixel"},
      {changed("exposure_s = 0.01\n", ""), "series[1].exposure_s", "found no such key"},
      {changed("exposure_s = 0.01", "exposures_s = [0.01, -1]"), "series[1].exposures_s[2]", "found -1"},
      {changed("exposure_s = 0.01", "exposures_s = []"), "series[1].exposures_s", "found an empty list"},
      {changed("exposure_s = 0.01", "exposures_s = [1e-3, 1e-2]\nlights = [0.5, 1]"), "series[1].lights",
       "exposures_s"},
      {changed("exposure_s = 0.01", "exposures_s = [1e-3]\nexposure_s = 1"), "series[1].exposures_s",
       "beside"},
      {changed("frames = 2", "frames = 0"), "series[1].frames", "from 1 to 100000"},
      {changed("exposure_s = 0.01\nframes = 2",
               "lights = [1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11]\nexposure_s = 0\nframes = 100000"),
       "series", "found 1100004 frames"},
      {changed("kind = \"bias\"", "kind = \"bias\"\nexposure_s = 0.1"), "series[2].exposure_s", "a bias is"},
      {changed("kind = \"bias\"", "kind = \"bias\"\nlight = 1"), "series[2].light", "flats only"},
      {changed("kind = \"bias\"", "kind = \"bios\""), "series[2].kind", "flat, dark or bias"},
      {kScene + amplifier, "amplifier", "found amplifiers of 32 columns, expected the frame's 64"},
      {kScene + amplifier + amplifier, "amplifier[2].name", "a second time"},
      {kScene + amplifier + "[[amplifier]]\nname = \"b\"\nwidth = 40\n", "amplifier[2].width",
       "found amplifiers of 72"},
      {kScene + amplifier + "[[amplifier]]\nname = \"b\"\nx = 30\nwidth = 32\n", "amplifier[2].x",
       "found 30, expected 32"},
      {kScene + "[[amplifier]]\nname = \"whole\"\nwidth = 64\n", "amplifier[1].name", "found \"whole\""},
      {kScene + "[hits]\nper_frame = 2\n", "hits.per_frame", "mean_e"},
      {kScene + "[output]\ncompression = \"rice\"\n", "output.compression", "none, deflate, lzw or packbits"},
      {kScene + "[output]\nextensions = true\n", "output.extensions", "fits only"},
      {kScene + "[output]\nformt = \"tiff\"\n", "output.formt", "format"},
  };
  for (const Row& row : rows) {
    CAPTURE(row.text);
    const std::string line = error_of(row.text);
    CAPTURE(line);
    CHECK(line.starts_with("scene.toml, "));
    CHECK(line.find(row.place) != std::string::npos);
    CHECK(line.find(row.found) != std::string::npos);
    CHECK(line.find("found ") != std::string::npos);
    CHECK(line.find("expected ") != std::string::npos);
    CHECK(line.find('\n') == std::string::npos);
  }
}

TEST_CASE("The sample scene is read") {
  const auto scene = read_scene(EVENFIELD_SOURCE_DIR "/sample_frames/scene.toml");
  REQUIRE(scene);
  CHECK(scene->series.size() == 20);
}

}  // namespace
}  // namespace evenfield
