#include "simulate/random.h"

#include <doctest/doctest.h>

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/poisson.hpp>
#include <cmath>
#include <set>
#include <vector>

namespace evenfield {
namespace {

/// Chi-square of counts against the exact probabilities of a Poisson number; classes of under 10 expected go
/// together.
struct Fit {
  double chi_square = 0.0;
  int classes = 0;
};

Fit fit_to_poisson(double mean, int draws, Engine& engine) {
  const auto reach = static_cast<std::size_t>(mean + 12.0 * std::sqrt(mean) + 20.0);
  std::vector<double> seen(reach + 1, 0.0);
  for (int draw = 0; draw < draws; ++draw)
    seen[std::min(static_cast<std::size_t>(poisson(engine, mean)), reach)] += 1.0;
  const boost::math::poisson exact(mean);
  Fit fit;
  double observed = 0.0, expected = 0.0, left = draws;
  for (std::size_t value = 0; value <= reach; ++value) {
    const double here = draws * boost::math::pdf(exact, static_cast<double>(value));
    observed += seen[value];
    expected += here;
    left -= here;
    if (expected < 10.0 || left < 10.0) continue;
    fit.chi_square += (observed - expected) * (observed - expected) / expected;
    ++fit.classes;
    observed = expected = 0.0;
  }
  // What is left is one class more: the tail.
  expected += left;
  fit.chi_square += (observed - expected) * (observed - expected) / expected;
  ++fit.classes;
  return fit;
}

TEST_CASE("Poisson numbers have the exact shape on both sides of the change of method at 10") {
  // Probability of a chi-square this large from the exact distribution: above 1e-4 each, with fixed seeds.
  for (const double mean : {0.02, 0.5, 3.0, 9.99, 10.0, 10.01, 25.0, 300.0, 8000.0}) {
    CAPTURE(mean);
    Engine engine = engine_for(7, Stream::frame_pixels, static_cast<std::uint64_t>(mean * 100));
    const Fit fit = fit_to_poisson(mean, 200'000, engine);
    REQUIRE(fit.classes > 1);
    const double chance =
        boost::math::cdf(boost::math::complement(boost::math::chi_squared(fit.classes - 1), fit.chi_square));
    CHECK(chance > 1e-4);
    CHECK(chance < 1.0 - 1e-4);
  }
}

TEST_CASE("Poisson numbers of a large mean have it as their variance too") {
  Engine engine = engine_for(3, Stream::frame_pixels);
  const double mean = 5e7;
  const int draws = 100'000;
  double sum = 0.0, squares = 0.0;
  for (int draw = 0; draw < draws; ++draw) {
    const double off = static_cast<double>(poisson(engine, mean)) - mean;
    sum += off;
    squares += off * off;
  }
  // Standard errors: sqrt(mean / n), and mean x sqrt(2 / n) as for a normal number.
  CHECK(std::abs(sum / draws) < 4.0 * std::sqrt(mean / draws));
  CHECK(std::abs(squares / draws / mean - 1.0) < 4.0 * std::sqrt(2.0 / draws));
}

TEST_CASE("A mean of zero, below zero or beyond the limit is no trap") {
  Engine engine = engine_for(3, Stream::frame_pixels);
  CHECK(poisson(engine, 0.0) == 0);
  CHECK(poisson(engine, -1.0) == 0);
  CHECK(poisson(engine, std::nan("")) == 0);
  CHECK(std::abs(static_cast<double>(poisson(engine, 1e300)) - kLargestPoissonMean) <
        6.0 * std::sqrt(kLargestPoissonMean));
}

TEST_CASE("Every purpose, series and frame has numbers of its own, and always the same") {
  std::set<std::uint64_t> first;
  for (std::uint64_t seed : {0, 1, 2})
    for (const Stream stream : {Stream::response, Stream::frame_pixels, Stream::frame_conditions})
      for (std::uint64_t series = 0; series < 5; ++series)
        for (std::uint64_t frame = 0; frame < 5; ++frame)
          first.insert(engine_for(seed, stream, series, frame)());
  CHECK(first.size() == 3U * 3U * 5U * 5U);
  CHECK(engine_for(9, Stream::offset, 3, 4)() == engine_for(9, Stream::offset, 3, 4)());
}

TEST_CASE("The generator is the 64-bit Mersenne twister of the C++ standard") {
  // ISO C++ [rand.predef]: the 10000th value of a default-constructed mt19937_64 is 9981545732273789042.
  Engine engine;
  engine.discard(9999);
  CHECK(engine() == 9981545732273789042U);
}

}  // namespace
}  // namespace evenfield
