#pragma once
/// Random numbers that are the same on every machine: engines and distributions of Boost, seeded by name.
///
/// Each purpose, and each frame, has an engine of its own, found from numbers and not from what was drawn
/// before: frames can be made in any order and on any number of threads, and changing one parameter of a
/// scene leaves the draws for all others as they are.

#include <boost/random/mersenne_twister.hpp>
#include <cstdint>

namespace evenfield {

using Engine = boost::random::mt19937_64;

/// What an engine is for. The numbers are part of what makes a scene reproducible: never reuse one.
enum class Stream : std::uint64_t {
  response = 1,
  row_response = 2,
  column_response = 3,
  offset = 4,
  row_offset = 5,
  column_offset = 6,
  read_noise = 7,
  hot_pixels = 8,
  frame_conditions = 9,  ///< scale, jitter and hits of a frame
  frame_pixels = 10
};

Engine engine_for(std::uint64_t seed, Stream stream, std::uint64_t series = 0, std::uint64_t frame = 0);

/// Largest mean of poisson(); what is above is taken as this.
constexpr double kLargestPoissonMean = 2.0e9;

/// A Poisson number of mean `mean` >= 0, exact in distribution at every mean. Below 10 by inversion, from
/// there on by the transformed rejection of W. Hoermann, Insurance: Mathematics and Economics 12 (1993)
/// 39-45.
std::int64_t poisson(Engine& engine, double mean);

double standard_normal(Engine& engine);
double uniform(Engine& engine);  ///< in [0, 1)
double exponential(Engine& engine, double mean);

}  // namespace evenfield
