#include "ingest/session_reader.h"

#include <algorithm>
#include <cstdint>
#include <limits>
#include <string>
#include <unordered_map>
#include <utility>

#include "base/parallel.h"
#include "formats/toml_document.h"
#include "ingest/session_files.h"

namespace evenfield {
namespace {

namespace fs = std::filesystem;

constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr std::int64_t kMaxInt = std::numeric_limits<int>::max();
constexpr NumberRange kAboveZero{0, kInfinity, true};
constexpr NumberRange kFromZero{0, kInfinity};
constexpr NumberRange kFraction{0, 1};
constexpr double kLongestExposure_s = 1e6;  // eleven days
constexpr NumberRange kCelsius{-273.15, kInfinity, true};

template <class T, class U>
void put_over(std::optional<T>& target, const std::optional<U>& value) {
  if (value) target = static_cast<T>(*value);
}

/// Identity of a camera rests on these words, and an empty one would make strangers alike.
std::optional<std::string> some_text(TomlTable& table, std::string_view key) {
  auto text = table.text(key);
  if (text && text->empty()) table.fail(key, "found an empty string, expected some text or no such key");
  return text;
}

void read_camera(TomlTable table, Camera& camera) {
  put_over(camera.label, some_text(table, "label"));
  put_over(camera.serial, some_text(table, "serial"));
  put_over(camera.detector, table.one_of("detector", {"ccd", "cmos", "emccd", "apd", "pmt"}));
  put_over(camera.mode, some_text(table, "mode"));
  put_over(camera.binning, table.integer("binning", 1, 1024));
  put_over(camera.bit_depth, table.integer("bit_depth", 1, 32));
  put_over(camera.pixel_pitch_um, table.number("pixel_pitch_um", kAboveZero));
  put_over(camera.single_electron_dn, table.number("single_electron_dn", kAboveZero));
  if (const auto mosaic = table.text("mosaic"))
    table.fail("mosaic",
               "found \"" + *mosaic +
                   "\", expected no mosaic: this version does not measure the channels of a colour mosaic");
}

void read_light(TomlTable& table, Light& light) {
  put_over(light.wavelength_nm, table.number("wavelength_nm", kAboveZero));
  put_over(light.irradiance_w_per_m2, table.number("irradiance_w_per_m2", kFromZero));
  put_over(light.irradiance_relative_standard_uncertainty,
           table.number("irradiance_relative_standard_uncertainty", kFraction));
  put_over(light.level_relative_standard_uncertainty,
           table.number("level_relative_standard_uncertainty", kFraction));
}

void put_over(GivenSettings& given, GivenSettings newer) {
  std::unordered_map<std::string, std::size_t> places;
  for (std::size_t i = 0; i < given.size(); ++i) places.emplace(given[i].first, i);
  for (auto& one : newer) {
    const auto [place, is_new] = places.try_emplace(one.first, given.size());
    if (is_new)
      given.push_back(std::move(one));
    else
      given[place->second].second = std::move(one.second);
  }
}

/// [camera] and [light] of `root`, over what `session` has.
void read_camera_and_light(TomlTable& root, Session& session) {
  if (auto table = root.table("camera")) {
    read_camera(*table, session.camera);
    put_over(session.camera_given, table->scalars());
  }
  if (auto table = root.table("light")) {
    if (!session.light) session.light.emplace();
    read_light(*table, *session.light);
    put_over(session.light_given, table->scalars());
  }
}

Status read_camera_file(const fs::path& file, Session& session) {
  auto document = TomlDocument::read(file);
  if (!document) return document.error();
  TomlTable root = document->root();
  root.integer("schema", 1, 1);
  if (!root.has("camera") && !root.has("light"))
    root.fail("", "found neither [camera] nor [light], expected one of them");
  read_camera_and_light(root, session);
  return document->finish();
}

std::optional<int> required_int(TomlTable& table, std::string_view key, std::int64_t low) {
  table.require(key);
  std::optional<int> value;
  put_over(value, table.integer(key, low, kMaxInt));
  return value;
}

bool overlap(const Rect& a, const Rect& b) {
  const auto spans_meet = [](std::int64_t start, std::int64_t size, std::int64_t other,
                             std::int64_t other_size) {
    return start < other + other_size && other < start + size;
  };
  return spans_meet(a.x, a.width, b.x, b.width) && spans_meet(a.y, a.height, b.y, b.height);
}

void read_overscan(TomlTable& table, SessionRegion& region) {
  const auto numbers = table.integers("overscan", 4);
  if (!numbers) return;
  constexpr std::int64_t kLows[] = {0, 0, 1, 1};
  for (std::size_t i = 0; i < 4; ++i)
    if ((*numbers)[i] < kLows[i] || (*numbers)[i] > kMaxInt) {
      table.fail("overscan[" + std::to_string(i + 1) + ']',
                 "found " + std::to_string((*numbers)[i]) + ", expected an integer from " +
                     std::to_string(kLows[i]) + " to " + std::to_string(kMaxInt));
      return;
    }
  const auto number = [&numbers](std::size_t i) { return static_cast<int>((*numbers)[i]); };
  region.overscan = Rect{number(0), number(1), number(2), number(3)};
  if (overlap(*region.overscan, region.rect))
    table.fail("overscan", "found an overscan that overlaps its region, expected pixels outside it");
}

/// `names` are those of the regions so far, with their numbers.
SessionRegion read_region(TomlTable& table, std::unordered_map<std::string, std::size_t>& names) {
  SessionRegion region;
  table.require("name");
  region.name = table.text("name").value_or("");
  const auto refuse = [&](const std::string& expected) {
    table.fail("name", "found \"" + region.name + "\", expected " + expected);
  };
  if (region.name.empty()) refuse("a name of at least one character");
  if (region.name == "whole")
    refuse("another name: this one stands for the whole frame of a session without regions");
  if (std::any_of(region.name.begin(), region.name.end(),
                  [](char c) { return c == '@' || c == '\x7F' || static_cast<unsigned char>(c) < 0x20; }))
    refuse("a name without @ and control characters");
  const auto [first, is_new] = names.try_emplace(region.name, names.size() + 1);
  if (!is_new) refuse("a name other than that of region[" + std::to_string(first->second) + ']');
  region.rect.x = required_int(table, "x", 0).value_or(0);
  region.rect.y = required_int(table, "y", 0).value_or(0);
  region.rect.width = required_int(table, "width", kSmallestRegion).value_or(kSmallestRegion);
  region.rect.height = required_int(table, "height", kSmallestRegion).value_or(kSmallestRegion);
  read_overscan(table, region);
  region.reads_toward = table.one_of("reads_toward", {"left", "right", "up", "down"});
  return region;
}

struct SeriesTable {
  Series series;
  SeriesFileNames files;
};

SeriesTable read_series(TomlTable table, const std::optional<Light>& session_light) {
  Series series;
  Conditions& conditions = series.conditions;
  table.require("kind");
  const std::string kind = table.one_of("kind", {"flat", "dark", "bias"}).value_or("flat");
  conditions.kind = kind == "flat" ? SeriesKind::flat : kind == "dark" ? SeriesKind::dark : SeriesKind::bias;
  conditions.exposure_s = table.number("exposure_s", NumberRange{0.0, kLongestExposure_s});
  if (conditions.kind == SeriesKind::bias) {
    if (conditions.exposure_s.value_or(0) != 0)
      table.fail("exposure_s",
                 "found an exposure above 0, expected 0 or no such key: a bias is a dark of zero exposure");
    conditions.exposure_s = 0;
  }
  conditions.light = table.number("light", kFromZero).value_or(1);
  conditions.temperature_c = table.number("temperature_c", kCelsius);
  conditions.em_gain = table.number("em_gain", kAboveZero);
  conditions.control_v = table.number("control_v", kFromZero);
  series.light = session_light.value_or(Light{});
  read_light(table, series.light);
  series.where = table.where("");
  table.require("files");
  auto names = table.texts("files").value_or(std::vector<std::string>{});
  return {std::move(series), {std::move(table), std::move(names)}};
}

/// A flat alone has neither offset nor noise floor: nothing could be said about it.
void check_kinds(const std::vector<SeriesTable>& tables) {
  const auto is_flat = [](const SeriesTable& one) { return one.series.conditions.kind == SeriesKind::flat; };
  if (tables.empty() || !std::all_of(tables.begin(), tables.end(), is_flat)) return;
  TomlTable first = tables.front().files.table;
  first.fail("kind", "found no dark or bias series, expected at least one in a session of flats");
}

std::string size_of(const FrameShape& shape) {
  return std::to_string(shape.width) + " x " + std::to_string(shape.height) + " pixels";
}

Status inspect_files(OpenedSession& opened, int threads) {
  const std::vector<SessionFile>& files = opened.session.files;
  opened.frame_files.resize(files.size());
  const Status inspected =
      for_each_item(static_cast<int>(files.size()), threads, [&](int item, int) -> Status {
        const auto index = static_cast<std::size_t>(item);
        auto file = inspect(files[index].path);
        if (!file) return file.error();
        if (file->pages.empty())
          return Error{Errc::input, {files[index].path, {}, {}, {}}, "found no frame, expected at least one"};
        opened.frame_files[index] = std::move(*file);
        return Done{};
      });
  if (!inspected) return inspected.error();

  const FrameShape& first = opened.frame_files.front().pages.front().shape;
  for (std::size_t index = 0; index < files.size(); ++index)
    for (std::size_t page = 0; page < opened.frame_files[index].pages.size(); ++page) {
      const FrameShape& shape = opened.frame_files[index].pages[page].shape;
      if (shape == first) continue;
      return Error{Errc::input,
                   {files[index].path, {}, static_cast<int>(page) + 1, {}},
                   "found " + size_of(shape) + " of " + name_of(shape.type) + ", expected " + size_of(first) +
                       " of " + name_of(first.type) + " as in the session's first frame, " +
                       files.front().shown};
    }
  if (first.width < kSmallestRegion || first.height < kSmallestRegion)
    return Error{
        Errc::input,
        {files.front().path, {}, 1, {}},
        "found " + size_of(first) + ", expected at least " + size_of({kSmallestRegion, kSmallestRegion, {}})};
  opened.session.shape = first;
  return Done{};
}

Status check_inside(const Where& where, const Rect& rect, const FrameShape& frame, const char* what) {
  const std::int64_t right = std::int64_t{rect.x} + rect.width, bottom = std::int64_t{rect.y} + rect.height;
  if (right <= frame.width && bottom <= frame.height) return Done{};
  return Error{Errc::input, where,
               std::string("found ") + what + " of columns " + std::to_string(rect.x) + " to " +
                   std::to_string(right - 1) + " and rows " + std::to_string(rect.y) + " to " +
                   std::to_string(bottom - 1) + ", expected it inside the frame of " + size_of(frame)};
}

Status check_regions(const std::vector<TomlTable>& tables, const Session& session) {
  for (std::size_t i = 0; i < tables.size(); ++i) {
    const SessionRegion& region = session.regions[i];
    const Status inside = check_inside(tables[i].where(""), region.rect, session.shape, "a region");
    if (!inside) return inside.error();
    if (!region.overscan) continue;
    const Status outer =
        check_inside(tables[i].where("overscan"), *region.overscan, session.shape, "an overscan");
    if (!outer) return outer.error();
  }
  return Done{};
}

std::optional<std::string> earliest_flat(const OpenedSession& opened) {
  // Without the final Z, times of UTC sort as text, fractions of a second included.
  const auto sortable = [](const std::string& time) {
    return time.substr(0, time.find_last_not_of('Z') + 1);
  };
  std::optional<std::string> earliest;
  for (const Series& series : opened.session.series) {
    if (series.conditions.kind != SeriesKind::flat) continue;
    for (const FrameReference& frame : series.frames) {
      const auto& time = opened.frame_files[static_cast<std::size_t>(frame.file)].header.acquired;
      if (time && (!earliest || sortable(*time) < sortable(*earliest))) earliest = time;
    }
  }
  return earliest;
}

Result<OpenedSession> open_session(TomlDocument document,
                                   const fs::path& file,
                                   int threads,
                                   const std::optional<fs::path>& camera_file) {
  OpenedSession opened;
  Session& session = opened.session;
  session.file = file;
  TomlTable root = document.root();
  if (!root.has("schema")) root.fail("schema", "found no such key, expected schema = 1");
  root.integer("schema", 1, 1);
  session.acquired = root.time("acquired");
  read_camera_and_light(root, session);
  if (auto table = root.table("analysis")) {
    session.analysis.gain_model = table->one_of("gain_model", {"auto", "line", "curved"}).value_or("auto");
    session.analysis.hot_rate_e_per_s = table->number("hot_rate_e_per_s", kAboveZero);
    session.analysis_given = table->scalars();
  }
  if (camera_file) {
    const Status over = read_camera_file(*camera_file, session);
    if (!over) return over.error();
  }
  std::vector<TomlTable> region_tables = root.tables("region");
  std::unordered_map<std::string, std::size_t> region_names;
  for (TomlTable& table : region_tables) session.regions.push_back(read_region(table, region_names));
  session.regions_listed = !session.regions.empty();

  root.require("series");
  std::vector<SeriesTable> tables;
  for (TomlTable& table : root.tables("series"))
    tables.push_back(read_series(std::move(table), session.light));
  if (tables.empty()) root.fail("series", "found an empty list, expected at least one [[series]]");
  check_kinds(tables);
  if (const Status status = document.finish(); !status) return status.error();

  std::vector<SeriesFileNames> names;
  for (const SeriesTable& table : tables) names.push_back(table.files);
  auto found = find_series_files(file, names);
  if (!found) return found.error();
  session.files = std::move(found->files);
  if (const Status status = inspect_files(opened, threads); !status) return status.error();
  if (const Status status = check_regions(region_tables, session); !status) return status.error();
  if (!session.regions_listed)
    session.regions.push_back({"whole", {0, 0, session.shape.width, session.shape.height}, {}, {}});

  for (std::size_t i = 0; i < tables.size(); ++i) {
    Series& series = session.series.emplace_back(std::move(tables[i].series));
    for (const int index : found->of_series[i]) {
      const auto pages = static_cast<int>(opened.frame_files[static_cast<std::size_t>(index)].pages.size());
      for (int page = 1; page <= pages; ++page) series.frames.push_back({index, page});
    }
  }
  if (!session.acquired) session.acquired = earliest_flat(opened);
  return opened;
}

}  // namespace

Result<OpenedSession> read_session(const fs::path& file,
                                   int threads,
                                   const std::optional<fs::path>& camera_file) {
  auto document = TomlDocument::read(file);
  if (!document) return document.error();
  return open_session(std::move(*document), file, threads, camera_file);
}

Result<OpenedSession> read_session_text(std::string_view text,
                                        const fs::path& name,
                                        int threads,
                                        const std::optional<fs::path>& camera_file) {
  auto document = TomlDocument::parse(text, name);
  if (!document) return document.error();
  return open_session(std::move(*document), name, threads, camera_file);
}

}  // namespace evenfield
