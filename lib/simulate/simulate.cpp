#include "simulate/simulate.h"

#include <algorithm>
#include <condition_variable>
#include <memory>
#include <mutex>
#include <string>
#include <vector>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "formats/frame_writer.h"
#include "simulate/expose.h"
#include "simulate/scene_folder.h"
#include "simulate/sensor.h"
#include "simulate/session_text.h"
#include "simulate/truth_json.h"

namespace evenfield {
namespace {

/// A frame of the session: which one of which series.
struct Place {
  int series = 0;
  int frame = 0;
};

WriteOptions write_options(const Scene& scene, const SceneSeries& series) {
  const Conditions& taken = series.conditions;
  WriteOptions options;
  options.format = scene.output.format;
  options.compression = scene.output.compression;
  options.extensions = scene.output.extensions;
  if (options.format != WriteFormat::fits) return options;
  const bool is_flat = taken.kind == SeriesKind::flat;
  options.text_keywords.emplace_back("IMAGETYP", name_of(taken.kind));
  // FITS times are in UTC and carry no mark of it (FITS standard 4.0, 9.1.1).
  if (scene.acquired)
    options.text_keywords.emplace_back("DATE-OBS", scene.acquired->substr(0, scene.acquired->find('Z')));
  options.number_keywords.emplace_back("EXPTIME", taken.exposure_s.value_or(0.0));
  if (is_flat) options.number_keywords.emplace_back("LIGHT", taken.light);
  if (taken.temperature_c) options.number_keywords.emplace_back("CCD-TEMP", *taken.temperature_c);
  return options;
}

/// Takes the frames of a session in order and keeps the one file open that they go to.
class SessionWriter {
  const Scene& scene_;
  const std::filesystem::path& folder_;
  std::unique_ptr<FrameWriter> file_;

 public:
  SessionWriter(const Scene& scene, const std::filesystem::path& folder) : scene_(scene), folder_(folder) {}

  Status add(const Place& place, const std::vector<std::uint16_t>& codes) {
    const SceneSeries& series = scene_.series[static_cast<std::size_t>(place.series)];
    const int frames_a_file = scene_.output.stacks ? series.frames : 1;
    const int in_file = place.frame % frames_a_file;
    if (in_file == 0) {
      const std::vector<std::string> names = frame_file_names(scene_, series);
      const std::string& name = names[static_cast<std::size_t>(place.frame / frames_a_file)];
      auto created = create_frames(folder_ / name, {scene_.width, scene_.height, PixelType::u16},
                                   frames_a_file, write_options(scene_, series));
      if (!created) return created.error();
      file_ = std::move(*created);
    }
    if (Status added = file_->add(codes.data()); !added) return added;
    if (in_file + 1 < frames_a_file) return Done{};
    return file_->finish();
  }
};

std::vector<Place> places_of(const Scene& scene) {
  std::vector<Place> places;
  for (int series = 0; series < static_cast<int>(scene.series.size()); ++series)
    for (int frame = 0; frame < scene.series[static_cast<std::size_t>(series)].frames; ++frame)
      places.push_back({series, frame});
  return places;
}

/// Frames are exposed in parallel and written in order: whoever has one ready waits for its turn.
Status write_frames(const Sensor& sensor,
                    const std::filesystem::path& folder,
                    const SimulateOptions& options) {
  const std::vector<Place> places = places_of(sensor.scene);
  const int frames = static_cast<int>(places.size());
  const int workers = std::clamp(options.threads, 1, frames);
  std::vector<std::vector<std::uint16_t>> buffers(static_cast<std::size_t>(workers),
                                                  std::vector<std::uint16_t>(sensor.response.size()));
  SessionWriter writer(sensor.scene, folder);
  std::mutex guard;
  std::condition_variable turn;
  int next = 0;
  bool stopped = false;
  return for_each_item(frames, workers, [&](int item, int worker) -> Status {
    const Place& place = places[static_cast<std::size_t>(item)];
    std::vector<std::uint16_t>& codes = buffers[static_cast<std::size_t>(worker)];
    expose(sensor, place.series, place.frame, codes);
    std::unique_lock lock(guard);
    turn.wait(lock, [&] { return stopped || next == item; });
    if (stopped) return Done{};  // an earlier frame has reported why
    Status status = writer.add(place, codes);
    if (status && options.progress && !options.progress(item + 1, frames)) status = interrupted();
    stopped = !status;
    ++next;
    turn.notify_all();
    return status;
  });
}

}  // namespace

Status simulate(const Scene& scene, const std::filesystem::path& folder, const SimulateOptions& options) {
  auto target = SceneFolder::begin(folder);
  if (!target) return target.error();
  const Sensor sensor = realize(scene);
  if (Status written = write_frames(sensor, target->path(), options); !written) return written;
  if (Status written = target->write(kSessionFileName, session_text(scene)); !written) return written;
  if (Status written = target->write(kTruthFileName, truth_json(sensor)); !written) return written;
  return target->commit();
}

}  // namespace evenfield
