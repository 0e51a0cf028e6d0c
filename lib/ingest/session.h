#pragma once
/// A session as its file describes it: camera, light, regions, and series of frames found on disk.

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "base/conditions.h"
#include "base/error.h"
#include "base/image.h"

namespace evenfield {

struct Camera {
  std::optional<std::string> label, serial, mode;
  std::optional<std::string> detector;  ///< ccd | cmos | emccd | apd | pmt
  std::optional<int> binning;
  std::optional<int> bit_depth;
  std::optional<double> pixel_pitch_um;
  std::optional<double> single_electron_dn;
};

struct Light {
  std::optional<double> wavelength_nm;
  std::optional<double> irradiance_w_per_m2;
  std::optional<double> irradiance_relative_standard_uncertainty;
  std::optional<double> level_relative_standard_uncertainty;
};

struct SessionRegion {
  std::string name;
  Rect rect;
  std::optional<Rect> overscan;
  std::optional<std::string> reads_toward;
};

struct FrameReference {
  int file = 0;  ///< index into Session::files
  int page = 1;  ///< from 1
};

struct Series {
  Conditions conditions;
  Light light;  ///< the session's, with this series' own keys over it
  std::vector<FrameReference> frames;
  Where where;  ///< of the series in the session file
};

struct SessionFile {
  std::filesystem::path path;  ///< as it can be opened
  std::string shown;           ///< for results: relative to the session file's folder when inside it, else as
                               ///< the session file wrote it; control characters and bad UTF-8 escaped
};

struct SessionAnalysis {
  std::string gain_model = "auto";         ///< auto | line | curved
  std::optional<double> hot_rate_e_per_s;  ///< threshold of the list of hot pixels, above 0
};

/// A value per key that was given, in file order, for the record in result.json.
using GivenSettings =
    std::vector<std::pair<std::string, std::variant<std::string, double, std::int64_t, bool>>>;

struct Session {
  std::filesystem::path file;
  std::optional<std::string>
      acquired;  ///< RFC 3339 in UTC: of the session file, else the earliest of the flats' headers
  Camera camera;
  std::optional<Light> light;
  SessionAnalysis analysis;
  GivenSettings camera_given, light_given, analysis_given;
  std::vector<SessionRegion> regions;  ///< at least one; "whole" if the file lists none
  bool regions_listed = false;
  std::vector<Series> series;      ///< in file order
  std::vector<SessionFile> files;  ///< each once, in order of first use
  FrameShape shape;                ///< of every frame
};

}  // namespace evenfield
