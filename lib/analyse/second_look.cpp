#include "analyse/second_look.h"

#include <map>

#include "analyse/dark_noise_parts.h"
#include "analyse/levels.h"
#include "analyse/nonuniformity.h"
#include "model/quantization.h"

namespace evenfield {

std::vector<SecondLook> plan_second_look(const AnalysisInput& input) {
  std::map<std::size_t, SecondLook> looks;
  const auto look = [&](std::size_t series) -> SecondLook& {
    SecondLook& out = looks[series];
    out.series = series;
    return out;
  };
  const Codes codes = find_codes(input);
  for (std::size_t region = 0; region < input.regions.size(); ++region) {
    const RegionLevels levels(input, region, codes);
    const Nonuniformity pattern = find_nonuniformity(levels);
    if (pattern.dark) look(pattern.dark->series).pictures = true;
    if (pattern.light) {
      look(pattern.light->series).pictures = true;
      look(pattern.light_high_pass_dark_series);
    }
    const auto darks = noise_series(levels);
    if (darks && levels.summary(*darks).frames >= kFramesForPixelNoise &&
        *levels.summary(*darks).variance > kUnresolvedVariance * codes.step_dn * codes.step_dn)
      look(*darks).noise = true;
  }
  std::vector<SecondLook> out;
  for (const auto& [series, wanted] : looks) out.push_back(wanted);
  return out;
}

}  // namespace evenfield
