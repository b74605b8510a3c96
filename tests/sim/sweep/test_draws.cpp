// Draws against SciPy, Boost.Math, published tables and their own definitions.
#include <algorithm>
#include <boost/math/distributions/normal.hpp>
#include <catch2/catch.hpp>
#include <numeric>
#include <set>

#include "sim/sweep/draws.hpp"
#include "sim/sweep/plan.hpp"

using namespace slipbench;

namespace {

constexpr DrawKind kinds[] = {DrawKind::random, DrawKind::latin_hypercube, DrawKind::sobol, DrawKind::saltelli};

std::vector<std::vector<double>> walked(DrawKind kind, std::uint64_t n, std::size_t keys, std::uint64_t seed) {
  Draws draws(kind, n, keys, seed);
  std::vector<std::vector<double>> points;
  for (std::uint64_t k = 0; k < draws.cases(); ++k) points.push_back(draws.point(k));
  return points;
}

// Kolmogorov's distance of a sample from the uniform distribution, times sqrt(n).
double kolmogorov(std::vector<double> x) {
  std::sort(x.begin(), x.end());
  const auto n = static_cast<double>(x.size());
  double distance = 0.0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    const auto rank = static_cast<double>(i);
    distance = std::max({distance, (rank + 1.0) / n - x[i], x[i] - rank / n});
  }
  return distance * std::sqrt(n);
}

}  // namespace

TEST_CASE("sobol draws: the points are SciPy's", "[sweep][published]") {
  // scipy.stats.qmc.Sobol(d=6, scramble=False).random(1024), SciPy 1.10.1, rows k + 1: case 0 is the point after the origin.
  // Both take the directions of S. Joe, F.Y. Kuo, SIAM J. Sci. Comput. 30, 2008, 2635-2654; dyadic numbers, so equal to the bit.
  struct Row {
    std::uint64_t k;
    std::array<double, 6> u;
  };
  const Row rows[] = {{0, {0.5, 0.5, 0.5, 0.5, 0.5, 0.5}},
                      {1, {0.75, 0.25, 0.25, 0.25, 0.75, 0.75}},
                      {2, {0.25, 0.75, 0.75, 0.75, 0.25, 0.25}},
                      {3, {0.375, 0.375, 0.625, 0.875, 0.375, 0.125}},
                      {4, {0.875, 0.875, 0.125, 0.375, 0.875, 0.625}},
                      {7, {0.1875, 0.3125, 0.9375, 0.4375, 0.5625, 0.3125}},
                      {8, {0.6875, 0.8125, 0.4375, 0.9375, 0.0625, 0.8125}},
                      {100, {0.9140625, 0.7578125, 0.2734375, 0.2265625, 0.3828125, 0.2421875}},
                      {1000, {0.7197265625, 0.5966796875, 0.0185546875, 0.1767578125, 0.7802734375, 0.4072265625}}};
  const auto all = walked(DrawKind::sobol, 1023, 6, 0);
  for (const Row& row : rows) {
    INFO("point " << row.k);
    CHECK(all[row.k] == std::vector<double>(row.u.begin(), row.u.end()));
  }
  // The same with d = 40, rows 1 to 7, columns 20 and 39.
  const std::array<std::array<double, 2>, 7> far{
      {{0.5, 0.5}, {0.25, 0.25}, {0.75, 0.75}, {0.125, 0.875}, {0.625, 0.375}, {0.375, 0.625}, {0.875, 0.125}}};
  const auto wide = walked(DrawKind::sobol, 7, 40, 0);
  for (std::size_t k = 0; k < far.size(); ++k) CHECK((wide[k][20] == far[k][0] && wide[k][39] == far[k][1]));
}

TEST_CASE("draws: a pure function of the case, in any order and any shard", "[sweep][property]") {
  for (const DrawKind kind : kinds) {
    constexpr std::uint64_t n = 300;
    const auto all = walked(kind, n, 4, 7);
    Draws jumping(kind, n, 4, 7);
    for (std::uint64_t k = all.size(); k-- > 0;) REQUIRE(jumping.point(k) == all[k]);
    for (std::uint64_t shard = 0; shard < 3; ++shard) {
      Draws part(kind, n, 4, 7);
      for (std::uint64_t k = shard; k < all.size(); k += 3) REQUIRE(part.point(k) == all[k]);
    }
    Draws again(kind, n, 4, 7);
    REQUIRE(again.point(5) == all[5]);
    REQUIRE(again.point(5) == all[5]);
    CHECK(walked(kind, n, 4, 8) != all);
    CHECK_THROWS_AS(again.point(all.size()), std::out_of_range);
  }
  // A jump far into the sequence costs no walk: n is ten million million.
  Draws far(DrawKind::sobol, 10'000'000'000'000u, 3, 1);
  const std::vector<double> at = far.point(9'999'999'999'998u);
  CHECK(far.point(9'999'999'999'999u) != at);
  CHECK(far.point(9'999'999'999'998u) == at);
}

TEST_CASE("draws: every coordinate lies inside (0, 1)", "[sweep][property]") {
  for (const DrawKind kind : kinds) {
    for (const std::uint64_t seed : {0u, 1u, 2u}) {
      for (const auto& point : walked(kind, 2000, 5, seed)) {
        for (const double u : point) REQUIRE((u > 0.0 && u < 1.0));
      }
    }
  }
  CHECK_THROWS_AS(Draws(DrawKind::random, 0, 1, 1), std::invalid_argument);
  CHECK_THROWS_AS(Draws(DrawKind::random, 1, 0, 1), std::invalid_argument);
  CHECK_THROWS_AS(Draws(DrawKind::sobol, 1, most_drawn_keys + 1, 1), std::invalid_argument);
  CHECK(Draws(DrawKind::saltelli, 1, most_drawn_keys, 1).point(0).size() == most_drawn_keys);
}

TEST_CASE("sobol draws: a seed shifts each key by one amount, modulo 1", "[sweep][property]") {
  const auto plain = walked(DrawKind::sobol, 500, 3, 0), shifted = walked(DrawKind::sobol, 500, 3, 9);
  for (std::size_t j = 0; j < 3; ++j) {
    const auto moved = [&](std::size_t k) {
      const double d = shifted[k][j] - plain[k][j];
      return d < 0.0 ? d + 1.0 : d;
    };
    // Coordinates are rounded to 2^-53 a few times.
    for (std::size_t k = 1; k < plain.size(); ++k) REQUIRE(moved(k) == Approx(moved(0)).margin(1e-15));
    CHECK(moved(0) > 1e-3);
  }
}

TEST_CASE("latin hypercube: each stratum of each key is met once", "[sweep][published]") {
  // The definition: McKay, Beckman, Conover, Technometrics 21(2), 1979.
  for (const std::uint64_t n : {1u, 2u, 7u, 100u, 1021u}) {
    const auto points = walked(DrawKind::latin_hypercube, n, 5, 3);
    for (std::size_t j = 0; j < 5; ++j) {
      std::set<std::uint64_t> met;
      for (const auto& p : points) met.insert(static_cast<std::uint64_t>(p[j] * static_cast<double>(n)));
      CHECK(met.size() == n);
      CHECK(*met.rbegin() == n - 1);
    }
    if (n > 6) CHECK(points[0][0] != points[0][1]);
  }
}

TEST_CASE("permuted: a permutation for any length, another for each seed and key", "[sweep][property]") {
  for (const std::uint64_t n : {1u, 2u, 3u, 4u, 5u, 15u, 16u, 17u, 63u, 64u, 65u, 1000u, 1023u, 1025u, 4097u}) {
    for (const std::uint64_t seed : {0u, 1u}) {
      std::vector<std::uint64_t> seen;
      for (std::uint64_t k = 0; k < n; ++k) seen.push_back(permuted(k, n, seed, 2));
      std::vector<std::uint64_t> sorted = seen, all(n);
      std::iota(all.begin(), all.end(), 0u);
      std::sort(sorted.begin(), sorted.end());
      CHECK(sorted == all);
      if (n > 60) {
        CHECK(seen != all);
        CHECK(seen[n / 2] + 1 != seen[n / 2 + 1]);
      }
    }
  }
  int same = 0;
  for (std::uint64_t k = 0; k < 1000; ++k) same += permuted(k, 1000, 1, 0) == permuted(k, 1000, 1, 1);
  CHECK(same < 10);  // independent permutations agree in 1 place on average; 10 or more: 1e-7 (Poisson)
  CHECK(permuted(999'999'999'999u, 1'000'000'000'000u, 5, 0) < 1'000'000'000'000u);
}

TEST_CASE("permuted: where 0 goes is uniform over seeds", "[sweep][statistics]") {
  constexpr int seeds = 4000, n = 10;
  std::array<int, n> hits{};
  for (std::uint64_t seed = 0; seed < seeds; ++seed) hits[permuted(0, n, seed, 0)] += 1;
  double chi2 = 0.0;
  for (const int h : hits) chi2 += (h - seeds / n) * (h - seeds / n) / static_cast<double>(seeds / n);
  CHECK(chi2 < 27.88);  // 99.9 % point of chi squared with 9 degrees of freedom (standard tables)
}

TEST_CASE("random draws: uniform and free of correlation", "[sweep][statistics]") {
  constexpr std::size_t n = 20'000, keys = 5;
  const auto points = walked(DrawKind::random, n, keys, 11);
  for (std::size_t j = 0; j < keys; ++j) {
    std::vector<double> x;
    for (const auto& p : points) x.push_back(p[j]);
    CHECK(kolmogorov(x) < 1.95);  // 99.9 % point of Kolmogorov's distribution (standard tables)
    for (std::size_t i = 0; i < j; ++i) {
      double sum = 0.0;
      for (const auto& p : points) sum += (p[i] - 0.5) * (p[j] - 0.5);
      CHECK(std::fabs(sum * 12.0 / n) < 4.0 / std::sqrt(n));  // four standard errors
    }
  }
}

TEST_CASE("saltelli draws: A, B, and A with one key of B after the other", "[sweep][published]") {
  // Saltelli et al., Comput. Phys. Commun. 181, 2010, table 2: f(A), f(B), f(A_B^(i)); (A, B) one point in 2 d.
  const auto both = walked(DrawKind::sobol, 50, 6, 0);
  const auto cases = walked(DrawKind::saltelli, 50, 3, 0);
  REQUIRE(cases.size() == 50 * 5);
  for (std::size_t b = 0; b < both.size(); ++b) {
    const std::vector<double>& ab = both[b];
    CHECK(cases[5 * b] == std::vector<double>{ab[0], ab[1], ab[2]});
    CHECK(cases[5 * b + 1] == std::vector<double>{ab[3], ab[4], ab[5]});
    CHECK(cases[5 * b + 2] == std::vector<double>{ab[3], ab[1], ab[2]});
    CHECK(cases[5 * b + 3] == std::vector<double>{ab[0], ab[4], ab[2]});
    CHECK(cases[5 * b + 4] == std::vector<double>{ab[0], ab[1], ab[5]});
  }
}

TEST_CASE("normal quantile: published values and Boost.Math's", "[sweep][published]") {
  // Wichura's own check values (Applied Statistics 37, 1988; from memory), and 97.5 % from any table.
  const std::array<std::array<double, 2>, 4> published{{{0.25, -0.6744897501960817},
                                                        {0.001, -3.090232306167814},
                                                        {1e-20, -9.262340089798408},
                                                        {0.975, 1.959963984540054}}};
  for (const auto& [p, x] : published) CHECK(normal_quantile(p) == Approx(x).epsilon(1e-15));  // as printed
  const boost::math::normal standard;
  std::vector<double> ps = {0x1p-54, 1e-300, 1e-16, 0.075, 0.0750001, 0.0749999, 0.425, 0.5, 0.925, 1.0 - 0x1p-53};
  for (int i = 1; i < 2000; ++i) ps.push_back(i / 2000.0);
  double worst = 0.0;
  for (const double p : ps) {
    const double theirs = boost::math::quantile(standard, p), ours = normal_quantile(p);
    if (theirs != 0.0) worst = std::max(worst, std::fabs(ours / theirs - 1.0));
  }
  CAPTURE(worst);
  CHECK(worst < 2e-15);  // 1e-15 each: Boost.Math states a few units in the last place for its own
  CHECK(normal_quantile(0.5) == 0.0);
  for (const double p : {0.1, 0.3, 0.02}) CHECK(normal_quantile(1.0 - p) == Approx(-normal_quantile(p)).epsilon(1e-14));
}

TEST_CASE("drawn keys: quantiles of their distribution", "[sweep][property]") {
  DrawnKey uniform;
  uniform.low = 0.7, uniform.high = 1.5;
  CHECK(uniform.at(0.25) == Approx(0.9).epsilon(1e-15));
  DrawnKey normal;
  normal.distribution = DrawnKey::Distribution::normal;
  normal.mean = 1.0, normal.sigma = 0.1;
  CHECK(normal.at(0.5) == 1.0);
  CHECK(normal.at(0.975) == Approx(1.1959963984540054).epsilon(1e-14));
}
