#include "ingest/session_reader.h"

#include <doctest/doctest.h>

#include <string>

#include "session_folder.h"

namespace evenfield {
namespace {

const std::string kDark =
    "[[series]]\nkind = \"dark\"\nexposure_s = 0.01\nfiles = [\"dark.tif\"]\n";  // 4 lines
const std::string kFlat = "[[series]]\nkind = \"flat\"\nexposure_s = 0.01\nfiles = [\"flat.tif\"]\n";

/// A folder with one stack of darks and one of flats, 64 x 48 pixels each.
class SmallSession : public SessionFolder {
 public:
  SmallSession() {
    write("dark.tif", tiff_bytes(64, 48, 16, 2));
    write("flat.tif", tiff_bytes(64, 48, 16, 3, "2026:11:24 09:30:00"));
  }
  Result<OpenedSession> open(const std::string& text) const {
    write("s.toml", text);
    return read_session(path() / "s.toml", 2);
  }
  /// The session of `text`, which must be one without error.
  OpenedSession good(const std::string& text) const {
    auto opened = open(text);
    const std::string reason = opened ? "" : to_line(opened.error());
    REQUIRE(reason == "");
    return *opened;
  }
  /// The error of `text`, the folder left out; "" if there is none.
  std::string error_line(const std::string& text) const {
    const auto opened = open(text);
    if (opened) return "";
    CHECK(exit_status(opened.error().code) == 3);  // INTERFACE: 3, the input cannot be used
    std::string line = to_line(opened.error());
    const std::string prefix = path().string() + '/';
    for (std::size_t at = line.find(prefix); at != std::string::npos; at = line.find(prefix))
      line.erase(at, prefix.size());
    return line;
  }
};

TEST_CASE("everything that a session file can say is kept") {
  const SmallSession folder;
  folder.write("bias.tif", tiff_bytes(64, 48));
  const OpenedSession opened = folder.good(R"(schema = 1
acquired = 2026-11-24T11:30:00+02:00
[camera]
label = "bay 3 camera"
serial = "BAY3-01"
detector = "cmos"
mode = "slow, low noise"
binning = 1
bit_depth = 12
pixel_pitch_um = 6.5
single_electron_dn = 12.0
[light]
wavelength_nm = 530
irradiance_w_per_m2 = 2.1e-3
irradiance_relative_standard_uncertainty = 0.015
level_relative_standard_uncertainty = 0.0
[analysis]
gain_model = "curved"
hot_rate_e_per_s = 100.0
[[region]]
name = "left"
x = 0
y = 0
width = 32
height = 48
overscan = [32, 0, 4, 48]
reads_toward = "left"
[[series]]
kind = "flat"
exposure_s = 0.010
light = 0.5
temperature_c = -10.0
em_gain = 3.0
control_v = 650.0
wavelength_nm = 640
files = ["flat.tif"]
[[series]]
kind = "bias"
files = ["bias.tif"]
[[series]]
kind = "dark"
files = ["dark.tif"]
)");
  const Session& session = opened.session;
  CHECK(session.acquired == "2026-11-24T09:30:00Z");
  CHECK(session.camera.label == "bay 3 camera");
  CHECK(session.camera.serial == "BAY3-01");
  CHECK(session.camera.detector == "cmos");
  CHECK(session.camera.mode == "slow, low noise");
  CHECK(session.camera.binning == 1);
  CHECK(session.camera.bit_depth == 12);
  CHECK(session.camera.pixel_pitch_um == 6.5);
  CHECK(session.camera.single_electron_dn == 12.0);
  REQUIRE(session.light);
  CHECK(session.light->wavelength_nm == 530);
  CHECK(session.analysis.gain_model == "curved");
  CHECK(session.analysis.hot_rate_e_per_s == 100.0);
  REQUIRE(session.camera_given.size() == 8);
  CHECK(session.camera_given[2].first == "detector");
  CHECK(session.camera_given[4] == GivenSettings::value_type{"binning", std::int64_t{1}});
  CHECK(session.light_given.size() == 4);
  CHECK(session.analysis_given.size() == 2);

  REQUIRE(session.regions.size() == 1);
  CHECK(session.regions_listed);
  CHECK(session.regions[0].name == "left");
  CHECK(session.regions[0].rect == Rect{0, 0, 32, 48});
  CHECK(session.regions[0].overscan == Rect{32, 0, 4, 48});
  CHECK(session.regions[0].reads_toward == "left");

  REQUIRE(session.series.size() == 3);
  const Series& flat = session.series[0];
  CHECK(flat.conditions.kind == SeriesKind::flat);
  CHECK(flat.conditions.exposure_s == 0.010);
  CHECK(flat.conditions.light == 0.5);
  CHECK(flat.conditions.temperature_c == -10.0);
  CHECK(flat.conditions.em_gain == 3.0);
  CHECK(flat.conditions.control_v == 650.0);
  CHECK(flat.light.wavelength_nm == 640);  // the series' own, over the session's
  CHECK(flat.light.irradiance_w_per_m2 == 2.1e-3);
  CHECK(flat.where.line == 28);
  CHECK(flat.frames.size() == 3);
  CHECK(flat.frames[2].page == 3);
  CHECK(session.series[1].conditions.exposure_s == 0.0);  // a bias is a dark of zero exposure
  CHECK(session.series[1].light.wavelength_nm == 530);
  CHECK_FALSE(session.series[2].conditions.exposure_s);
  CHECK(session.series[2].conditions.light == 1.0);

  CHECK(session.shape == FrameShape{64, 48, PixelType::u16});
  REQUIRE(session.files.size() == 3);
  REQUIRE(opened.frame_files.size() == 3);
  CHECK(session.files[1].shown == "bias.tif");
  CHECK(opened.frame_files[1].path == session.files[1].path);
  CHECK(opened.frame_files[0].pages.size() == 3);
}

TEST_CASE("without regions the whole frame is one, and the time is that of the earliest flat") {
  const SmallSession folder;
  folder.write("later.tif", tiff_bytes(64, 48, 16, 1, "2026:11:24 10:00:00"));
  folder.write("dark.tif", tiff_bytes(64, 48, 16, 2, "2020:01:01 00:00:00"));
  const Session session = folder
                              .good("schema = 1\n" + kDark +
                                    "[[series]]\nkind = \"flat\"\nfiles = [\"later.tif\", \"flat.tif\"]\n")
                              .session;
  REQUIRE(session.regions.size() == 1);
  CHECK_FALSE(session.regions_listed);
  CHECK(session.regions[0].name == "whole");
  CHECK(session.regions[0].rect == Rect{0, 0, 64, 48});
  CHECK(session.acquired == "2026-11-24T09:30:00Z");
  CHECK_FALSE(session.light);
}

TEST_CASE("darks alone are a session") {
  const SmallSession folder;
  const Session session = folder.good("schema = 1\n" + kDark).session;
  CHECK(session.series.size() == 1);
  CHECK_FALSE(session.acquired);
}

TEST_CASE("a camera file overrides camera and light key by key") {
  const SmallSession folder;
  folder.write("camera.toml", "[camera]\nserial = \"B\"\nbit_depth = 14\n[light]\nwavelength_nm = 400\n");
  folder.write("s.toml", "schema = 1\n[camera]\nserial = \"A\"\nbinning = 2\n" + kDark + kFlat);
  const auto opened = read_session(folder.path() / "s.toml", 1, folder.path() / "camera.toml");
  REQUIRE(opened);
  const Session& session = opened->session;
  CHECK(session.camera.serial == "B");
  CHECK(session.camera.binning == 2);
  CHECK(session.camera.bit_depth == 14);
  REQUIRE(session.light);
  CHECK(session.series[1].light.wavelength_nm == 400);
  const GivenSettings expected{
      {"serial", std::string("B")}, {"binning", std::int64_t{2}}, {"bit_depth", std::int64_t{14}}};
  CHECK(session.camera_given == expected);

  folder.write("camera.toml", "[camera]\nserail = \"B\"\n");
  const auto misspelt = read_session(folder.path() / "s.toml", 1, folder.path() / "camera.toml");
  REQUIRE_FALSE(misspelt);
  CHECK(to_line(misspelt.error()) == (folder.path() / "camera.toml").string() +
                                         ", line 2, camera.serail: found an unknown key, expected serial");
  folder.write("camera.toml", "schema = 1\n");
  const auto empty = read_session(folder.path() / "s.toml", 1, folder.path() / "camera.toml");
  REQUIRE_FALSE(empty);
  CHECK(to_line(empty.error()) == (folder.path() / "camera.toml").string() +
                                      ": found neither [camera] nor [light], expected one of them");
}

TEST_CASE("a session given as text takes its paths from the folder of its name") {
  const SmallSession folder;
  const auto opened = read_session_text("schema = 1\n" + kDark + kFlat, folder.path() / "surveyed.toml", 1);
  REQUIRE(opened);
  CHECK(opened->session.files[1].path == folder.path() / "flat.tif");
}

TEST_CASE("the same session comes out for any number of threads") {
  const SmallSession folder;
  std::string text = "schema = 1\n" + kFlat + "[[series]]\nkind = \"dark\"\nfiles = [\"many/*.tif\"]\n";
  for (int i = 0; i < 40; ++i)
    folder.write("many/" + std::to_string(100 + i) + ".tif", tiff_bytes(64, 48, 16, 1 + i % 3));
  folder.write("s.toml", text);
  const auto one = read_session(folder.path() / "s.toml", 1);
  const auto many = read_session(folder.path() / "s.toml", 8);
  REQUIRE(one);
  REQUIRE(many);
  // 14 files of one page, 13 of two and 13 of three
  REQUIRE(one->session.series[1].frames.size() == 79);
  for (std::size_t i = 0; i < 79; ++i) {
    CHECK(one->session.series[1].frames[i].file == many->session.series[1].frames[i].file);
    CHECK(one->session.series[1].frames[i].page == many->session.series[1].frames[i].page);
  }
  // Two files are bad: the message is that of the first, whoever found it.
  folder.write("many/105.tif", tiff_bytes(64, 48).substr(0, 500));
  folder.write("many/130.tif", "no image");
  for (const int threads : {1, 8}) {
    const auto bad = read_session(folder.path() / "s.toml", threads);
    REQUIRE_FALSE(bad);
    CHECK(bad.error().where.file == folder.path() / "many/105.tif");
  }
}

TEST_CASE("a missing or later schema is refused") {
  const SmallSession folder;
  CHECK(folder.error_line(kDark) == "s.toml, schema: found no such key, expected schema = 1");
  CHECK(folder.error_line("schema = 2\n" + kDark) == "s.toml, line 1, schema: found 2, expected 1");
}

TEST_CASE("an unknown key is an error with near names") {
  const SmallSession folder;
  CHECK(folder.error_line("schema = 1\n" + kDark + kFlat + "exposre_s = 1\n") ==
        "s.toml, line 10, series[2].exposre_s: found an unknown key, expected exposure_s");
  CHECK(folder.error_line("schema = 1\n[camera]\nseriall = \"1\"\n" + kDark) ==
        "s.toml, line 3, camera.seriall: found an unknown key, expected serial");
  CHECK(folder.error_line("schema = 1\n[camra]\nserial = \"1\"\n" + kDark) ==
        "s.toml, line 2, camra: found an unknown key, expected camera");
  CHECK(folder.error_line("schema = 1\n[[serie]]\nkind = \"dark\"\n") ==
        "s.toml, series: found no such key (but serie), expected one");
}

TEST_CASE("a wrong type or a value out of range is an error") {
  const SmallSession folder;
  const auto camera = [&folder](const std::string& line) {
    return folder.error_line("schema = 1\n[camera]\n" + line + "\n" + kDark);
  };
  CHECK(camera("bit_depth = \"12\"") ==
        "s.toml, line 3, camera.bit_depth: found the string \"12\", expected an integer from 1 to 32");
  CHECK(camera("bit_depth = 33") ==
        "s.toml, line 3, camera.bit_depth: found 33, expected an integer from 1 to 32");
  CHECK(camera("pixel_pitch_um = 0") ==
        "s.toml, line 3, camera.pixel_pitch_um: found 0, expected a number greater than 0");
  CHECK(camera("detector = \"sCMOS\"") ==
        "s.toml, line 3, camera.detector: found the string \"sCMOS\", expected ccd, cmos, emccd, apd or pmt");
  CHECK(camera("serial = \"\"") ==
        "s.toml, line 3, camera.serial: found an empty string, expected some text or no such key");
  CHECK(camera("mosaic = \"2x2\"") ==
        "s.toml, line 3, camera.mosaic: found \"2x2\", expected no mosaic: this version "
        "does not measure the channels of a colour mosaic");
  CHECK(folder.error_line("schema = 1\n[analysis]\ngain_model = \"spline\"\n" + kDark) ==
        "s.toml, line 3, analysis.gain_model: found the string \"spline\", expected auto, line or curved");
  CHECK(folder.error_line("schema = 1\n[analysis]\nhot_rate_e_per_s = 0\n" + kDark) ==
        "s.toml, line 3, analysis.hot_rate_e_per_s: found 0, expected a number greater than 0");
  CHECK(folder.error_line("schema = 1\n[light]\nwavelength_nm = -530\n" + kDark) ==
        "s.toml, line 3, light.wavelength_nm: found -530, expected a number greater than 0");
  CHECK(folder.error_line("schema = 1\n" + kDark + "temperature_c = -300\n") ==
        "s.toml, line 6, series[1].temperature_c: found -300, expected a number greater than "
        "-273.15");
  CHECK(folder.error_line("schema = 1\n" + kDark + "irradiance_relative_standard_uncertainty = 1.5\n") ==
        "s.toml, line 6, series[1].irradiance_relative_standard_uncertainty: found 1.5, expected "
        "a number "
        "from 0 to 1");
  CHECK(folder.error_line("schema = 1\nseries = 3\n") ==
        "s.toml, line 2, series: found 3, expected a list of tables, [[series]]");
}

TEST_CASE("a negative exposure is an error, and so is a bias with one") {
  const SmallSession folder;
  CHECK(folder.error_line(
            "schema = 1\n[[series]]\nkind = \"dark\"\nexposure_s = -0.01\nfiles = [\"dark.tif\"]\n") ==
        "s.toml, line 4, series[1].exposure_s: found -0.01, expected a number from 0 to 1000000");
  CHECK(folder.error_line(
            "schema = 1\n[[series]]\nkind = \"bias\"\nexposure_s = 0.01\nfiles = [\"dark.tif\"]\n") ==
        "s.toml, line 4, series[1].exposure_s: found an exposure above 0, expected 0 or no such key: a bias "
        "is a dark of "
        "zero exposure");
}

TEST_CASE("a flat without a dark is an error at the first flat") {
  const SmallSession folder;
  CHECK(folder.error_line("schema = 1\n" + kFlat) ==
        "s.toml, line 3, series[1].kind: found no dark or bias series, expected at least one in "
        "a session of flats");
}

TEST_CASE("frames of another size or pixel type are an error that names file and page") {
  const SmallSession folder;
  folder.write("flat.tif", tiff_bytes(64, 32, 16, 2));
  CHECK(folder.error_line("schema = 1\n" + kDark + kFlat) ==
        "flat.tif, page 1: found 64 x 32 pixels of unsigned 16 bit, expected 64 x 48 pixels of unsigned 16 "
        "bit as in the "
        "session's first frame, dark.tif");
  folder.write("flat.tif", tiff_bytes(64, 48, 8));
  CHECK(folder.error_line("schema = 1\n" + kDark + kFlat) ==
        "flat.tif, page 1: found 64 x 48 pixels of unsigned 8 bit, expected 64 x 48 pixels of unsigned 16 "
        "bit as in the "
        "session's first frame, dark.tif");
  folder.write("dark.tif", tiff_bytes(7, 48));
  CHECK(folder.error_line("schema = 1\n" + kDark) ==
        "dark.tif, page 1: found 7 x 48 pixels, expected at least 8 x 8 pixels");
}

TEST_CASE("zero series, zero files and zero frames are errors") {
  const SmallSession folder;
  CHECK(folder.error_line("schema = 1\n") == "s.toml, series: found no such key, expected one");
  CHECK(folder.error_line("schema = 1\nseries = []\n") ==
        "s.toml, line 2, series: found an empty list, expected at least one [[series]]");
  CHECK(folder.error_line("schema = 1\n[[series]]\nkind = \"dark\"\nfiles = []\n") ==
        "s.toml, line 4, series[1].files: found an empty list, expected a list of one or more strings");
  CHECK(folder.error_line("schema = 1\n[[series]]\nkind = \"dark\"\n") ==
        "s.toml, line 2, series[1].files: found no such key, expected one");
  // A FITS file of nothing but a header with NAXIS = 0, padded to a block of 2880 bytes (FITS 4.0, sections 3
  // and 4).
  std::string header;
  for (const std::string card : {"SIMPLE  =                    T", "BITPIX  =                    8",
                                 "NAXIS   =                    0", "END"})
    header += card + std::string(80 - card.size(), ' ');
  header.resize(2880, ' ');
  folder.write("dark.tif", header);
  const std::string line = folder.error_line("schema = 1\n" + kDark);
  CHECK(line.find("dark.tif") == 0);
  CHECK(line.find("expected") != std::string::npos);
}

}  // namespace
}  // namespace evenfield
