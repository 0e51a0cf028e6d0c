#include "simulate/scene.h"

#include <array>

namespace evenfield {
namespace {

/// `number` with zeros in front, so that names sort as numbers do.
std::string padded(int number, int digits) {
  const std::string text = std::to_string(number);
  const auto wanted = static_cast<std::size_t>(digits);
  return std::string(text.size() < wanted ? wanted - text.size() : 0, '0') + text;
}

int digits_of(int largest) {
  int digits = 2;
  for (int rest = largest / 100; rest > 0; rest /= 10) ++digits;
  return digits;
}

}  // namespace

void name_series(Scene& scene) {
  std::array<int, 3> total{}, used{};
  for (const SceneSeries& series : scene.series) ++total.at(static_cast<std::size_t>(series.conditions.kind));
  for (SceneSeries& series : scene.series) {
    const auto kind = static_cast<std::size_t>(series.conditions.kind);
    series.name = std::string(name_of(series.conditions.kind)) + '_' +
                  padded(++used.at(kind), digits_of(total.at(kind)));
  }
}

double light_of(const SceneSeries& series) {
  return series.conditions.kind == SeriesKind::flat ? series.conditions.light : 0.0;
}

std::string frame_suffix(const SceneOutput& output) {
  return output.format == WriteFormat::tiff ? ".tif" : ".fits";
}

std::vector<std::string> frame_file_names(const Scene& scene, const SceneSeries& series) {
  const std::string suffix = frame_suffix(scene.output);
  if (scene.output.stacks) return {series.name + suffix};
  std::vector<std::string> names;
  for (int frame = 1; frame <= series.frames; ++frame)
    names.push_back(series.name + '_' + padded(frame, digits_of(series.frames)) + suffix);
  return names;
}

}  // namespace evenfield
