#include "simulate/random.h"

#include <algorithm>
#include <boost/random/normal_distribution.hpp>
#include <boost/random/poisson_distribution.hpp>
#include <boost/random/uniform_01.hpp>
#include <cmath>

namespace evenfield {
namespace {

/// The finishing step of the SplitMix64 generator (Steele, Lea and Flood, OOPSLA 2014): every bit of the
/// answer depends on every bit of the question.
std::uint64_t mixed(std::uint64_t value) {
  value += 0x9e3779b97f4a7c15U;
  value = (value ^ (value >> 30U)) * 0xbf58476d1ce4e5b9U;
  value = (value ^ (value >> 27U)) * 0x94d049bb133111ebU;
  return value ^ (value >> 31U);
}

constexpr double kInversionLimit = 10.0;

std::int64_t poisson_by_inversion(Engine& engine, double mean) {
  double rest = uniform(engine);
  double probability = std::exp(-mean);
  std::int64_t count = 0;
  // The sum of the probabilities may stay a rounding error below a draw next to 1; past 100 nothing is left.
  while (rest > probability && count < 100) {
    rest -= probability;
    ++count;
    probability *= mean / static_cast<double>(count);
  }
  return count;
}

}  // namespace

Engine engine_for(std::uint64_t seed, Stream stream, std::uint64_t series, std::uint64_t frame) {
  std::uint64_t key = mixed(seed);
  key = mixed(key ^ static_cast<std::uint64_t>(stream));
  key = mixed(key ^ series);
  key = mixed(key ^ frame);
  return Engine(key);
}

std::int64_t poisson(Engine& engine, double mean) {
  if (!(mean > 0.0)) return 0;
  if (mean < kInversionLimit) return poisson_by_inversion(engine, mean);
  return boost::random::poisson_distribution<std::int64_t, double>(std::min(mean, kLargestPoissonMean))(
      engine);
}

double standard_normal(Engine& engine) { return boost::random::normal_distribution<double>()(engine); }

double uniform(Engine& engine) { return boost::random::uniform_01<double>()(engine); }

double exponential(Engine& engine, double mean) { return -mean * std::log1p(-uniform(engine)); }

}  // namespace evenfield
