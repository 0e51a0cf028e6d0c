#include "pipeline.h"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <cmath>
#include <ctime>
#include <future>
#include <numeric>

#include "accumulate/accumulate.h"
#include "accumulate/mean_frame.h"
#include "analyse/analyse.h"
#include "analyse/dark_match.h"
#include "analyse/mean_frame_statistics.h"
#include "analyse/second_look.h"
#include "base/interrupt.h"
#include "ingest/open_stack.h"
#include "ingest/read_ahead.h"
#include "ingest/session_reader.h"
#include "model/radiometry.h"

namespace evenfield {
namespace {

/// Darks are not searched for hits in groups of two: a blinking pixel would be taken for one.
constexpr int kDarkFramesForHits = 3;

std::string now() {
  const std::time_t time = std::chrono::system_clock::to_time_t(std::chrono::system_clock::now());
  std::tm utc{};
  gmtime_r(&time, &utc);
  char text[32];
  return {text, std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &utc)};
}

AnalysisInput begin_input(const Session& session) {
  AnalysisInput input;
  input.bit_depth = session.camera.bit_depth;
  input.floating = is_floating(session.shape.type);
  if (session.analysis.gain_model == "line") input.gain_model = GainModel::line;
  if (session.analysis.gain_model == "curved") input.gain_model = GainModel::curved;
  if (session.light) {
    input.level_relative_uncertainty = session.light->level_relative_standard_uncertainty.value_or(0.0);
    input.irradiance_relative_uncertainty =
        session.light->irradiance_relative_standard_uncertainty.value_or(0.0);
  }
  for (const SessionRegion& region : session.regions) input.regions.push_back({region.name, region.rect});
  for (const Series& series : session.series) {
    SeriesInput& out = input.series.emplace_back();
    out.conditions = series.conditions;
    const Light& light = series.light;
    out.wavelength_nm = light.wavelength_nm;
    if (session.camera.pixel_pitch_um && light.wavelength_nm && light.irradiance_w_per_m2) {
      input.has_light = true;
      if (series.conditions.exposure_s)
        out.photons = photons_per_pixel(*session.camera.pixel_pitch_um, *light.wavelength_nm,
                                        *light.irradiance_w_per_m2 * series.conditions.light,
                                        *series.conditions.exposure_s);
    }
    for (const FrameReference& frame : series.frames) {
      const std::string& shown = session.files[static_cast<std::size_t>(frame.file)].shown;
      if (out.files.empty() || out.files.back() != shown) out.files.push_back(shown);
    }
  }
  return input;
}

/// Series in the order they are read: a flat needs the dark level that darks have shown.
std::vector<std::size_t> darks_first(const Session& session) {
  std::vector<std::size_t> order;
  for (const bool flats : {false, true})
    for (std::size_t s = 0; s < session.series.size(); ++s)
      if ((session.series[s].conditions.kind == SeriesKind::flat) == flats) order.push_back(s);
  return order;
}

AccumulateOptions options_for(const Series& series, int threads) {
  AccumulateOptions options;
  options.threads = threads;
  if (series.conditions.kind != SeriesKind::flat) options.fewest_frames_for_hits = kDarkFramesForHits;
  return options;
}

/// `input` holds what came before in the order of reading: all darks, if the series is a flat.
void add_series(const Series& series, SeriesStatistics sums, std::size_t s, AnalysisInput& input) {
  SeriesInput& out = input.series[s];
  for (std::size_t r = 0; r < input.regions.size(); ++r) {
    std::optional<double> dark_level;
    if (series.conditions.kind == SeriesKind::flat) {
      const SeriesWeights weights = match_dark(input, r, series.conditions).mean;
      if (!weights.empty())
        dark_level = std::accumulate(weights.begin(), weights.end(), 0.0, [&](double sum, const auto& dark) {
          return sum + dark.second * input.series[dark.first].regions[r].mean;
        });
    }
    out.regions.push_back(summarize(sums.regions[r], dark_level));
  }
  out.fingerprints = std::move(sums.fingerprints);
  out.code_sample = std::move(sums.code_sample);
}

/// Tells work that goes on beside that nobody waits for it any more.
class GiveUp {
 public:
  explicit GiveUp(std::atomic<bool>& flag) : flag_(flag) {}
  ~GiveUp() { flag_ = true; }
  GiveUp(const GiveUp&) = delete;
  GiveUp& operator=(const GiveUp&) = delete;

 private:
  std::atomic<bool>& flag_;
};

Status read_all(const OpenedSession& opened,
                const Geometry& geometry,
                int threads,
                Progress& progress,
                AnalysisInput& input) {
  const std::vector<std::size_t> order = darks_first(opened.session);
  std::uint64_t work = 0;
  for (const std::size_t s : order)
    work += reading_work(opened.session, opened.session.series[s], opened.frame_files);
  progress.work = work;
  progress.series = static_cast<int>(order.size());
  progress.stage = "reading frames";
  const ReadAhead read_ahead(opened.session, opened.frame_files, order, progress);
  ScratchFiles scratch;
  std::atomic<bool> give_up = false;
  const auto open = [&](std::size_t turn) {
    const Series& series = opened.session.series[order[turn]];
    return open_stack(opened.session, series, opened.frame_files, threads, {&progress, &scratch, &give_up});
  };
  // The next series is opened, which decodes it if need be, while the present one is measured: no core waits
  // for the last frame of either.
  std::future<Result<FrameStack>> next = std::async(std::launch::async, open, 0);
  const GiveUp on_return(give_up);  // after `next`, whose end waits for the work
  // What a series gave is summed up while the next one is read.
  std::future<void> summary;
  AccumulateBuffers buffers;
  for (std::size_t turn = 0; turn < order.size(); ++turn) {
    const Result<FrameStack> stack = next.get();
    if (!stack) return stack.error();
    if (interrupt_requested()) return interrupted();
    if (turn + 1 < order.size()) next = std::async(std::launch::async, open, turn + 1);
    const Series& series = opened.session.series[order[turn]];
    auto sums = accumulate(*stack, geometry, options_for(series, threads), buffers);
    if (summary.valid()) summary.get();
    if (!sums) return sums.error();
    summary =
        std::async(std::launch::async, [&series, &input, s = order[turn], made = std::move(*sums)]() mutable {
          add_series(series, std::move(made), s, input);
        });
    progress.series_done = static_cast<int>(turn) + 1;
  }
  if (summary.valid()) summary.get();
  return Done{};
}

/// Where the first look set hits aside: its threshold times the noise of the noisiest block, and two codes.
double hit_limit_dn(const RegionSummary& region) {
  if (region.hits == 0) return 0;
  double variance = 0;
  for (std::size_t b = 0; b < region.block_squares.size(); ++b)
    if (region.block_dof[b] > 0) variance = std::max(variance, region.block_squares[b] / region.block_dof[b]);
  return AccumulateOptions{}.hit_threshold * std::sqrt(variance * region.frames / (region.frames - 1)) + 2;
}

/// The second look: mean frames of a few series, of which a float a pixel is kept at a time.
Status look_again(const OpenedSession& opened, const MeasureOptions& options, AnalysisInput& input) {
  std::vector<Rect> rects;
  for (const Region& region : input.regions) rects.push_back(region.rect);
  input.mean_frames.resize(input.series.size());
  for (const SecondLook& look : plan_second_look(input)) {
    const Series& series = opened.session.series[look.series];
    const auto stack = open_stack(opened.session, series, opened.frame_files, options.threads);
    if (!stack) return stack.error();
    MeanFrameOptions how;
    how.threads = options.threads;
    if (look.noise)
      for (const RegionSummary& region : input.series[look.series].regions)
        how.frame_means.push_back(region.frame_means);
    for (const RegionSummary& region : input.series[look.series].regions)
      how.hit_limits.push_back(hit_limit_dn(region));
    auto images = mean_frame(*stack, rects, how);
    if (!images) return images.error();
    for (std::size_t r = 0; r < rects.size(); ++r) {
      const RegionSummary& summary = input.series[look.series].regions[r];
      PixelMeans& image = (*images)[r];
      MeanFrameFacts facts;
      if (image.variance) {
        facts.median_noise_dn = median_deviation(image.variances());
        facts.noise_log_variance = log_deviation_variance(image.variances());
      }
      image.variance.reset();  // before the next image of a float a pixel is made
      MeanFrameInput in;
      in.pixels = image.means();
      in.width = rects[r].width;
      in.height = rects[r].height;
      in.level_dn = image.level_dn;
      in.frames = image.frames;
      in.noise_left_dn2 = summary.variance.value_or(0.0) / image.frames;
      in.row_noise_left_dn2 =
          std::clamp(summary.row_noise_variance.value_or(0.0) / image.frames, 0.0, in.noise_left_dn2);
      in.continuous = input.floating;
      MeanFrameStatisticsOptions what;
      what.pictures = options.pictures && look.pictures;
      what.threads = options.threads;
      MeanFrameStatistics statistics = mean_frame_statistics(in, what);
      facts.high_pass = std::move(statistics.high_pass);
      facts.pictures = std::move(statistics.pictures);
      if (facts.pictures) facts.pictures->series = static_cast<int>(look.series * rects.size() + r);
      input.mean_frames[look.series].push_back(std::move(facts));
    }
  }
  return Done{};
}

}  // namespace

const char* program_version() { return EVENFIELD_VERSION; }

Result<Characterization> measure(const std::filesystem::path& session_file, const MeasureOptions& options) {
  Progress unseen;
  Progress& progress = options.progress != nullptr ? *options.progress : unseen;
  progress.stage = "reading headers";
  const auto opened = read_session(session_file, options.threads, options.camera_file);
  if (!opened) return opened.error();
  const Session& session = opened->session;
  AnalysisInput input = begin_input(session);
  std::vector<Rect> rects;
  for (const Region& region : input.regions) rects.push_back(region.rect);
  const Geometry geometry = make_geometry(session.shape, rects);

  if (const Status read = read_all(*opened, geometry, options.threads, progress, input); !read)
    return read.error();
  progress.work = 0;
  progress.series = 0;
  progress.stage = "analysing";
  if (const Status looked = look_again(*opened, options, input); !looked) return looked.error();
  if (interrupt_requested()) return interrupted();
  Characterization out = analyse(input);
  for (const SessionRegion& region : session.regions)
    for (Quantity& q : out.quantities)
      if (region.overscan && q.region == region.name && q.name == "dark_offset_dn")
        q.note +=
            std::string(q.note.empty() ? "" : "; ") + "the region's overscan is not used by this version";
  out.program_version = program_version();
  out.created = now();
  out.acquired = session.acquired;
  out.session = {session_file.filename().string(), session.camera_given, session.light_given,
                 session.analysis_given};
  for (std::size_t s = 0; s < session.series.size(); ++s)
    for (std::size_t f = 0; f < session.series[s].frames.size(); ++f) {
      const FrameReference& frame = session.series[s].frames[f];
      out.frames.push_back({session.files[static_cast<std::size_t>(frame.file)].shown, frame.page,
                            session.series[s].conditions.kind, input.series[s].fingerprints[f]});
    }
  return out;
}

}  // namespace evenfield
