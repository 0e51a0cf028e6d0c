// Frames of a real camera, from a public archive, against what others found. Skipped where they are not
// present.
#include <doctest/doctest.h>

#include <cmath>
#include <filesystem>
#include <fstream>

#include "base/parallel.h"
#include "pipeline.h"
#include "recover/camera.h"

using namespace evenfield;
using namespace evenfield::test;

namespace {

const std::filesystem::path kFrames =
    std::filesystem::path(EVENFIELD_SOURCE_DIR) / ".." / "shared" / "real_frames";

/// A session file in a folder of its own that names frames elsewhere.
class SessionText {
 public:
  explicit SessionText(const std::string& text) {
    static int number = 0;
    folder_ = std::filesystem::temp_directory_path() /
              ("evenfield_real_" + std::to_string(::getpid()) + "_" + std::to_string(number++));
    std::filesystem::create_directories(folder_);
    std::ofstream(folder_ / "session.toml") << text;
  }
  ~SessionText() { std::filesystem::remove_all(folder_); }
  SessionText(const SessionText&) = delete;
  SessionText& operator=(const SessionText&) = delete;
  std::filesystem::path file() const { return folder_ / "session.toml"; }

 private:
  std::filesystem::path folder_;
};

}  // namespace

TEST_CASE("two amplifiers of a real CCD: gain and read noise agree with published numbers") {
  const std::filesystem::path frames = kFrames / "two_amplifier_ccd";
  if (!std::filesystem::exists(frames)) {
    MESSAGE("skipped: no real frames beside the project");
    return;
  }
  // Rows and columns of the lit slit away from its edges; the regions are those of the two-frame check beside
  // the frames.
  const std::string folder = std::filesystem::canonical(frames).string();
  const SessionText session(R"(schema = 1
[camera]
detector = "ccd"
bit_depth = 16
[[region]]
name = "A"
x = 512
y = 60
width = 488
height = 220
[[region]]
name = "B"
x = 1040
y = 60
width = 960
height = 220
[[series]]
kind = "bias"
files = [")" + folder + R"(/b2*.fits.gz"]
[[series]]
kind = "flat"
exposure_s = 15
files = [")" + folder + "/b1*.fits.gz\"]\n");
  MeasureOptions options;
  options.threads = hardware_threads();
  const auto result = measure(session.file(), options);
  REQUIRE_MESSAGE(result, to_line(result.error()));
  struct Row {
    const char* region;
    double two_frame_e_per_dn;  // two-frame difference check of the README beside the frames (NumPy, 5 sigma
                                // clip)
  };
  for (const Row& row : {Row{"A", 1.211}, Row{"B", 1.255}}) {
    INFO(row.region);
    const Quantity& gain = quantity(*result, "conversion_gain_e_per_dn", row.region);
    const Quantity& noise = quantity(*result, "read_noise_e", row.region);
    REQUIRE(gain.value);
    REQUIRE(noise.value);
    INFO(*gain.value, " e-/DN, ", *noise.value, " e-");
    CHECK(*gain.value == doctest::Approx(row.two_frame_e_per_dn).epsilon(0.015));
    // Published: gain 1.2 e-/DN and read noise 3.7 e- of both amplifiers, instrument description in the
    // repository that the frames come from (via the README beside them).
    CHECK(*gain.value == doctest::Approx(1.2).epsilon(0.06));
    CHECK(*noise.value == doctest::Approx(3.7).epsilon(0.12));
    CHECK(*gain.standard_uncertainty / *gain.value < 0.01);
  }
  CHECK(result->frames.size() == 6);
  CHECK(result->regions.size() == 2);
}

TEST_CASE("a bias without noise is noticed, and one flat gives no gain") {
  const std::filesystem::path frames = kFrames / "one_flat_cmos";
  if (!std::filesystem::exists(frames)) {
    MESSAGE("skipped: no real frames beside the project");
    return;
  }
  const std::string folder = std::filesystem::canonical(frames).string();
  // bias_0 holds the number 32 in every pixel (README beside it); here it stands in for two frames of a
  // stack.
  const SessionText session(
      "schema = 1\n[camera]\nbit_depth = 12\n[[series]]\nkind = \"bias\"\nfiles = [\"" + folder +
      "/bias_0.fits\"]\n[[series]]\nkind = \"dark\"\nexposure_s = 300\nfiles = [\"" + folder +
      "/dark_0.fits\"]\n[[series]]\nkind = \"flat\"\nexposure_s = 300\nfiles = [\"" + folder +
      "/flat_0.fits\"]\n");
  const auto result = measure(session.file(), {});
  REQUIRE_MESSAGE(result, to_line(result.error()));
  for (const char* name : {"conversion_gain_dn_per_e", "read_noise_dn", "dsnu_dn", "prnu_percent"}) {
    INFO(name);
    CHECK(!quantity(*result, name).value);
    CHECK(!quantity(*result, name).note.empty());
  }
  CHECK(std::any_of(result->findings.begin(), result->findings.end(), [](const Finding& f) {
    return f.code == "too-few-frames" && f.severity == Severity::problem;
  }));
  // Means of the frames as the README beside them gives them: 708 DN and 37.5 DN.
  CHECK(result->series[2].mean_dn == doctest::Approx(708).epsilon(0.001));
  CHECK(result->series[1].mean_dn == doctest::Approx(37.5).epsilon(0.002));
}
