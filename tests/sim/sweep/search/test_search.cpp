// The search over the unit cube, on functions whose largest value is known.
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <set>
#include <stdexcept>

#include "sim/sweep/search.hpp"

using namespace slipbench;

namespace {

constexpr double none = std::numeric_limits<double>::quiet_NaN(), infinite = std::numeric_limits<double>::infinity();

template <class F>
Judge each(F f, std::vector<Point>* seen = nullptr) {
  return [f, seen](const std::vector<Point>& points) {
    std::vector<double> values;
    for (const Point& p : points) {
      values.push_back(f(p));
      if (seen != nullptr) seen->push_back(p);
    }
    return values;
  };
}

// F.H. Branin, IBM J. Res. Dev. 16(5), 1972, in its usual scaling to the unit square; least value 0.397887 at three points (closed form:
// 10 / (8 pi)).
double branin(const Point& u) {
  const double pi = 3.14159265358979323846, x = 15.0 * u[0] - 5.0, y = 15.0 * u[1];
  const double a = y - 5.1 / (4.0 * pi * pi) * x * x + 5.0 / pi * x - 6.0;
  return a * a + 10.0 * (1.0 - 1.0 / (8.0 * pi)) * std::cos(x) + 10.0;
}

}  // namespace

TEST_CASE("search: a maximum in a corner is met exactly, one in five dimensions too", "[sweep][search]") {
  for (const std::size_t d : {1u, 2u, 3u, 5u}) {
    INFO(d);
    const auto slope = [](const Point& p) {
      double sum = 0.0;
      for (std::size_t j = 0; j < p.size(); ++j) sum += static_cast<double>(j + 1) * (j % 2 == 0 ? p[j] : -p[j]);
      return sum;
    };
    const SearchOutcome found = largest_in_cube(d, 60, 1, each(slope));
    REQUIRE(found.best.size() == d);
    for (std::size_t j = 0; j < d; ++j) CHECK(found.best[j] == (j % 2 == 0 ? 1.0 : 0.0));
    CHECK(found.value == slope(found.best));
    CHECK_FALSE(found.flat);
    CHECK(found.evaluations <= 60);
  }
}

TEST_CASE("search: a maximum inside is found, in one to four dimensions", "[sweep][search]") {
  for (const std::size_t d : {1u, 2u, 4u}) {
    INFO(d);
    const auto hill = [](const Point& p) {
      double sum = 0.0;
      for (std::size_t j = 0; j < p.size(); ++j) sum -= (p[j] - 0.37) * (p[j] - 0.37) * static_cast<double>(1 + j);
      return 1.0 + sum;
    };
    const SearchOutcome found = largest_in_cube(d, 100, 1, each(hill));
    // A quadratic: BOBYQA's model holds it, and ends with steps of 1e-4 of the side; 1e-3 squared leaves room for its path.
    CHECK(found.value > 1.0 - 1e-6);
  }
}

TEST_CASE("search: several hills: the highest, not the next", "[sweep][search][published]") {
  const SearchOutcome found = largest_in_cube(2, 60, 1, each([](const Point& p) { return -branin(p); }));
  // Span of the function over the square: 308; a thousandth of a percent of that.
  CHECK(-found.value == Approx(10.0 / (8.0 * 3.14159265358979323846)).margin(3e-3));
  // A narrow hill that reaches higher than the broad one.
  const auto two = [](const Point& p) {
    const auto bump = [&](double x, double y, double width) {
      return std::exp(-((p[0] - x) * (p[0] - x) + (p[1] - y) * (p[1] - y)) / (width * width));
    };
    return 0.8 * bump(0.3, 0.3, 0.4) + 1.0 * bump(0.8, 0.75, 0.15);
  };
  CHECK(largest_in_cube(2, 80, 1, each(two)).best[0] ==
        Approx(0.8).margin(0.02));  // the broad hill's tail moves it by less
}

TEST_CASE("search: a flat function is told as such, and not searched to the end", "[sweep][search]") {
  const SearchOutcome found = largest_in_cube(3, 1000, 1, each([](const Point&) { return 2.5; }));
  CHECK(found.flat);
  CHECK(found.value == 2.5);
  CHECK(found.evaluations < 700);  // a third and a quarter of the budget
}

TEST_CASE("search: within the budget, inside the cube, no point twice, the same points again", "[sweep][search]") {
  for (const std::size_t budget : {1u, 2u, 7u, 44u, 200u}) {
    INFO(budget);
    std::vector<Point> first, second, moved;
    const auto f = [](const Point& p) { return std::sin(7.0 * p[0]) + std::cos(5.0 * p[1]); };
    const SearchOutcome found = largest_in_cube(2, budget, 3, each(f, &first));
    (void)largest_in_cube(2, budget, 3, each(f, &second));
    (void)largest_in_cube(2, budget, 4, each(f, &moved));
    CHECK(first.size() == found.evaluations);
    CHECK(first.size() <= budget);
    CHECK(std::set<Point>(first.begin(), first.end()).size() == first.size());
    CHECK(first == second);
    if (budget > 40) CHECK(first != moved);
    for (const Point& p : first) {
      for (const double u : p) CHECK((u >= 0.0 && u <= 1.0));
    }
  }
}

TEST_CASE("search: points without a value are passed over; none at all gives none", "[sweep][search]") {
  const auto half = [](const Point& p) { return p[0] > 0.5 ? none : p[0] + p[1]; };
  const SearchOutcome found = largest_in_cube(2, 80, 1, each(half));
  CHECK(found.value > 1.45);  // 1.5 at the cliff's edge, which a smooth model cannot follow to the end
  CHECK(found.best[0] <= 0.5);
  CHECK(largest_in_cube(2, 30, 1, each([](const Point&) { return none; })).best.empty());
}

TEST_CASE("search: nothing is worse than infinity: it ends there", "[sweep][search]") {
  const SearchOutcome found =
      largest_in_cube(2, 500, 1, each([](const Point& p) { return p[0] > 0.9 && p[1] < 0.4 ? infinite : p[0]; }));
  CHECK(found.value == infinite);
  CHECK(found.best[0] > 0.9);
  CHECK(found.evaluations < 500);
  CHECK_FALSE(found.stopped);
}

TEST_CASE("search: stopped under way it keeps the best; a judge's error passes through", "[sweep][search]") {
  for (const std::size_t after : {1u, 5u, 20u, 30u, 40u}) {
    INFO(after);
    std::size_t calls = 0;
    const SearchOutcome found = largest_in_cube(2, 60, 1, [&](const std::vector<Point>& points) {
      std::vector<double> values;
      for (const Point& p : points) {
        if (++calls > after) return values;
        values.push_back(-std::abs(p[0] - 0.2));
      }
      return values;
    });
    CHECK(found.stopped);
    CHECK(found.evaluations == after);
    CHECK_FALSE(found.best.empty());
  }
  for (const std::size_t at : {1u, 25u, 45u}) {
    std::size_t calls = 0;
    const auto f = [&](const Point& p) {
      if (++calls == at) throw std::runtime_error("the judge's own");
      return -std::abs(p[0] - 0.2) - std::abs(p[1] - 0.6);
    };
    CHECK_THROWS_WITH(largest_in_cube(2, 60, 1, each(std::ref(f))), "the judge's own");
  }
}
