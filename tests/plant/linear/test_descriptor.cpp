#include <catch2/catch.hpp>

#include "plant/linear/descriptor.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/transfer.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

TEST_CASE("descriptor: an invertible E is divided out", "[linear]") {
  const Reduced r =
      reduce(rows({{2, 0}, {0, 4}}), system_of(rows({{-2, 2}, {0, -8}}), rows({{2}, {4}}), rows({{1, 0}})));
  CHECK(r.index == 0);
  CHECK(r.redundant.empty());
  CHECK((r.system.A - rows({{-1, 1}, {0, -2}})).norm() < 1e-15);
  CHECK((r.system.B - rows({{1}, {1}})).norm() < 1e-15);
}

TEST_CASE("descriptor: a resistor's current behind an inductor is redundant, and the row that fixes it is told",
          "[linear]") {
  // L i' = u - v, 0 = v - R i with L = 0.5 H, R = 3 ohm: i' = -6 i + 2 u, v = 3 i.
  System s = system_of(rows({{0, -1}, {-3, 1}}), rows({{1}, {0}}), rows({{0, 1}}));
  s.state_names = {"current", "voltage"};
  const Reduced r = reduce(rows({{0.5, 0}, {0, 0}}), s);
  CHECK(r.index == 1);
  REQUIRE(r.system.order() == 1);
  CHECK(r.system.A(0, 0) == Approx(-6.0).epsilon(1e-14));
  CHECK(r.system.B(0, 0) == Approx(2.0).epsilon(1e-14));
  CHECK(r.system.C(0, 0) == Approx(3.0).epsilon(1e-14));
  CHECK(r.system.state_names == std::vector<std::string>{"current"});
  REQUIRE(r.redundant.size() == 1);
  CHECK(r.redundant[0].variable == "voltage");
  CHECK(r.redundant[0].why == "voltage = 3 current: no equation holds its derivative");
}

TEST_CASE("descriptor: an algebraic variable that follows the input gives direct feed-through", "[linear]") {
  // x' = -x + w, 0 = w - 2 x - 5 u, y = w: x' = x + 5 u, y = 2 x + 5 u.
  const Reduced r =
      reduce(rows({{1, 0}, {0, 0}}), system_of(rows({{-1, 1}, {2, -1}}), rows({{0}, {5}}), rows({{0, 1}})));
  CHECK(r.system.A(0, 0) == Approx(1.0).epsilon(1e-13));
  CHECK(r.system.B(0, 0) == Approx(5.0).epsilon(1e-13));
  CHECK(r.system.D(0, 0) == Approx(5.0).epsilon(1e-13));
  CHECK_THAT(r.redundant[0].why, Contains("x2 = 2 x1 + 5 u1"));
}

TEST_CASE("descriptor: two inductors in series are one, by a constraint on derivatives", "[linear]") {
  // L1 i1' = u - v, L2 i2' = v - R i2, 0 = i1 - i2: (L1 + L2) i' = u - R i; index 2.
  System s = system_of(rows({{0, 0, -1}, {0, -6, 1}, {1, -1, 0}}), rows({{1}, {0}, {0}}), rows({{1, 0, 0}}));
  s.state_names = {"i1", "i2", "v"};
  const Reduced r = reduce(rows({{1, 0, 0}, {0, 2, 0}, {0, 0, 0}}), s);
  CHECK(r.index == 2);
  REQUIRE(r.system.order() == 1);
  CHECK(r.system.A(0, 0) == Approx(-2.0).epsilon(1e-13));
  CHECK(transfer_at(r.system, Complex(0, 1)).norm() == Approx(1.0 / 3.0 / std::sqrt(5.0)).epsilon(1e-13));
  REQUIRE(r.redundant.size() == 2);
  CHECK_THAT(r.redundant[0].why, Contains("constraint") || Contains("derivative"));
}

TEST_CASE("descriptor: a capacitor across a source: its current would be a derivative", "[linear]") {
  // C v' = i, 0 = v - u, y = i = C u': improper. y = v is proper: y = u.
  System s = system_of(rows({{0, 1}, {1, 0}}), rows({{0}, {-1}}), rows({{0, 1}}));
  const Matrix e = rows({{0.1, 0}, {0, 0}});
  CHECK_THAT(refusal([&] { reduce(e, s); }), Contains("improper") && Contains("output y1") && Contains("input u1"));
  s.C = rows({{1, 0}});
  const Reduced r = reduce(e, s);
  CHECK(r.system.order() == 0);
  CHECK(r.system.D(0, 0) == Approx(1.0).epsilon(1e-13));
  CHECK(r.redundant.size() == 2);
}

TEST_CASE("descriptor: a kept variable that jumps with the input, transfer function by hand", "[linear]") {
  // x1' + x2' = -x1, 0 = x2 - u: x1' = -x1 - u', so y = x1 = -s/(s + 1) u.
  const Reduced r =
      reduce(rows({{1, 1}, {0, 0}}), system_of(rows({{-1, 0}, {0, 1}}), rows({{0}, {-1}}), rows({{1, 0}})));
  REQUIRE(r.system.order() == 1);
  const Complex at(0.3, 2.0), g = transfer_at(r.system, at)(0, 0), exact = -at / (at + 1.0);
  CHECK(std::abs(g - exact) < 1e-13);
}

TEST_CASE("descriptor: a singular pencil names what is undetermined", "[linear]") {
  System s = system_of(rows({{-1, 0}, {-2, 0}}), rows({{1}, {0}}), rows({{1, 0}}));
  s.state_names = {"flux", "angle"};
  CHECK_THAT(refusal([&] { reduce(rows({{1, 0}, {0, 0}}), s); }), Contains("singular") && Contains("angle"));
}

TEST_CASE("descriptor: scales apart, order 0, shapes", "[linear]") {
  // The inductor above in microhenries and megaohms.
  const Reduced r =
      reduce(rows({{0.5e-6, 0}, {0, 0}}), system_of(rows({{0, -1}, {-3e6, 1}}), rows({{1}, {0}}), rows({{0, 1}})));
  CHECK(r.system.A(0, 0) == Approx(-6e12).epsilon(1e-13));
  CHECK(reduce(Matrix(0, 0), free_system(Matrix(0, 0))).system.order() == 0);
  CHECK_THAT(refusal([] { reduce(Matrix::Zero(1, 2), free_system(rows({{1}}))); }), Contains("E is 1 x 2"));
  // All algebraic: 0 = -2 x + u.
  const Reduced none = reduce(rows({{0}}), system_of(rows({{-2}}), rows({{1}}), rows({{1}})));
  CHECK(none.system.order() == 0);
  CHECK(none.system.D(0, 0) == Approx(0.5).epsilon(1e-15));
}
