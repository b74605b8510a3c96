#include <catch2/catch.hpp>
#include <cmath>

#include "plant/linear/decomposition.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/pbh.hpp"
#include "plant/linear/staircase.hpp"
#include "plant/linear/transfer.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

System diagonal() {
  return system_of(rows({{-1, 0, 0, 0}, {0, -2, 0, 0}, {0, 0, -3, 0}, {0, 0, 0, -4}}), rows({{1}, {1}, {0}, {0}}),
                   rows({{1, 0, 1, 0}}));
}

// The same, hidden by the T of the published example; its inverse by cofactors (determinant 2).
System hidden() {
  const Matrix t = rows({{1, 2, 0, 1}, {0, 1, 1, 0}, {1, 0, 1, 2}, {2, 1, 0, 1}});
  const Matrix back = svd(t).V * svd(t).s.cwiseInverse().asDiagonal() * svd(t).U.transpose();
  const System s = diagonal();
  return system_of(t * s.A * back, t * s.B, s.C * back);
}

}  // namespace

TEST_CASE("staircase: T is orthogonal, the zeros are there, rank and blocks are the chain's", "[linear]") {
  const System s = hidden();
  const Staircase c = controllable_staircase(s.A, s.B), o = observable_staircase(s.A, s.C);
  CHECK(c.rank == 2);
  CHECK(o.rank == 2);
  CHECK(c.blocks == std::vector<Eigen::Index>{1, 1});
  for (const Staircase* x : {&c, &o}) CHECK((x->T.transpose() * x->T - Matrix::Identity(4, 4)).norm() < 1e-14);
  const Matrix a = c.T.transpose() * s.A * c.T, b = c.T.transpose() * s.B;
  // Rounding of the hiding T, condition about 10.
  CHECK(a.bottomLeftCorner(2, 2).norm() < 1e-13 * s.A.norm());
  CHECK(b.bottomRows(2).norm() < 1e-14 * s.B.norm());
  CHECK((s.C * o.T).rightCols(2).norm() < 1e-14 * s.C.norm());
  CHECK(c.largest_dropped < c.tolerance);
  CHECK(c.smallest_kept > c.tolerance);
}

TEST_CASE("mode tests: which mode can be moved, which seen", "[linear]") {
  const auto tests = pbh(hidden());
  REQUIRE(tests.size() == 4);
  const bool controllable[] = {true, true, false, false}, observable[] = {true, false, true, false};
  for (std::size_t i = 0; i < 4; ++i) {
    CAPTURE(i);
    CHECK(tests[i].pole.real() == Approx(-1.0 - static_cast<double>(i)).epsilon(1e-12));
    CHECK(tests[i].controllable == controllable[i]);
    CHECK(tests[i].observable == observable[i]);
    CHECK((tests[i].controllability > 1e-3) == controllable[i]);
  }
}

TEST_CASE("mode tests: a repeated pole whose chain is moved at its end only", "[linear]") {
  const Matrix chain = rows({{-1, 1}, {0, -1}});
  const auto at_end = pbh(system_of(chain, rows({{0}, {1}}), rows({{1, 0}})));
  CHECK(at_end[0].controllable);
  CHECK(at_end[0].observable);
  const auto at_start = pbh(system_of(chain, rows({{1}, {0}}), rows({{0, 1}})));
  CHECK_FALSE(at_start[0].controllable);
  CHECK_FALSE(at_start[1].observable);
}

TEST_CASE("stabilisable, detectable: the mode that stands in the way is named", "[linear]") {
  std::string why;
  CHECK(stabilisable(hidden(), &why));
  CHECK_THAT(why, Contains("-3"));
  const System bad = system_of(rows({{-1, 0}, {0, 0.5}}), rows({{1}, {0}}), rows({{1, 0}}));
  CHECK_FALSE(stabilisable(bad, &why));
  CHECK_THAT(why, Contains("pole 0.5") && Contains("inputs can't move"));
  CHECK_FALSE(detectable(bad, &why));
  CHECK_THAT(why, Contains("pole 0.5") && Contains("outputs don't show"));
  CHECK(stabilisable(system_of(rows({{0.5}}), rows({{1}}), rows({{1}})), &why));
  CHECK_THAT(why, Contains("no mode"));
}

// Own example, checked by hand: A = diag(-1,-2,-3,-4), b = [1 1 0 0]', c = [1 0 1 0].
TEST_CASE("Kalman decomposition: four parts of one state each", "[linear][published]") {
  const KalmanForm f = kalman_form(hidden());
  CHECK(f.controllable_observable == 1);
  CHECK(f.controllable_only == 1);
  CHECK(f.observable_only == 1);
  CHECK(f.neither == 1);
  for (int i = 0; i < 4; ++i) CHECK(f.system.A(i, i) == Approx(-1.0 - i).epsilon(1e-12));
  CHECK(f.system.A(0, 1) == 0.0);
  CHECK(f.residual < 1e-13);
  CHECK(transfer_difference(hidden(), f.system) < 1e-12);
  CHECK(f.warning.empty());
}

TEST_CASE("minimal realisation: 1 / (s + 1), and what was left out is named", "[linear][published]") {
  const Minimal hid = minimal(hidden());
  REQUIRE(hid.system.order() == 1);
  CHECK(hid.system.A(0, 0) == Approx(-1.0).epsilon(1e-13));
  CHECK((hid.system.C * hid.system.B)(0, 0) == Approx(1.0).epsilon(1e-13));
  CHECK((hid.L * hid.R - Matrix::Identity(1, 1)).norm() < 1e-14);
  System s = diagonal();
  s.state_names = {"current", "flux", "speed", "angle"};
  const Minimal plain = minimal(s);
  CHECK(plain.system.state_names == std::vector<std::string>{"current"});
  REQUIRE(plain.removed.size() == 3);
  CHECK(plain.removed[0] == "pole -2 in flux: no output shows it");
  CHECK(plain.removed[1] == "pole -3 in speed: no input moves it");
  CHECK(plain.removed[2] == "pole -4 in angle: no input moves it and no output shows it");
}

TEST_CASE("minimal realisation: a difference of two equal lags is named as a combination", "[linear]") {
  const Minimal m = minimal(system_of(rows({{-1, 0}, {0, -1}}), rows({{1}, {1}}), rows({{1, 1}})));
  REQUIRE(m.system.order() == 1);
  REQUIRE(m.removed.size() == 1);
  CHECK_THAT(m.removed[0], Contains("a combination of") && Contains("(0.71)") && Contains("(-0.71)"));
}

// SLICOT Library, example of TB01PD: the system is minimal as it stands.
TEST_CASE("minimal realisation: the example of TB01PD keeps its order", "[linear][published]") {
  const System s =
      system_of(rows({{1, 2, 0}, {4, -1, 0}, {0, 0, 1}}), rows({{1}, {0}, {1}}), rows({{0, 1, -1}, {0, 0, 1}}));
  const Minimal m = minimal(s);
  CHECK(m.system.A == s.A);
  CHECK(m.removed.empty());
}

TEST_CASE("balanced realisation: Hankel values of two lags in closed form", "[linear]") {
  // 1 / (s + 1) has the Hankel singular value 1/2: half the DC gain.
  const Minimal one = balanced(system_of(rows({{-1}}), rows({{2}}), rows({{0.5}})));
  CHECK(one.hankel(0) == Approx(0.5).epsilon(1e-15));
  // 1/(s+1) + 1/(s+2): cross Gramian W_ij = 1/(p_i + p_j) = [1/2 1/3; 1/3 1/4], eigenvalues (9 +- sqrt(73)) / 24.
  const Minimal two = balanced(system_of(rows({{-1, 0}, {0, -2}}), rows({{1}, {1}}), rows({{1, 1}})));
  CHECK(two.hankel(0) == Approx((9 + std::sqrt(73.0)) / 24).epsilon(1e-13));
  CHECK(two.hankel(1) == Approx((9 - std::sqrt(73.0)) / 24).epsilon(1e-12));
  CHECK(two.residual < 1e-12);
  CHECK_THAT(refusal([] { balanced(system_of(rows({{1}}), rows({{1}}), rows({{1}}))); }), Contains("pole 1"));
}

TEST_CASE("modal form: blocks of the poles, transfer function kept", "[linear]") {
  const System s = system_of(rows({{0, 1, 0}, {0, 0, 1}, {-10, -12, -7}}), rows({{0}, {0}, {1}}), rows({{1, 2, 0}}));
  const Modal m = modal_form(s);
  const Matrix a = m.system.A;
  CHECK((s.A * m.T - m.T * a).norm() < 1e-13 * s.A.norm());
  CHECK(transfer_difference(s, m.system) < 1e-13);
  CHECK(a(0, 1) * a(1, 0) <= 0.0);
}

TEST_CASE("modal form: refused for a Jordan block, warned of next to one", "[linear]") {
  const auto at = [](double gap) {
    return modal_form(system_of(rows({{-1, 1}, {0, -1 - gap}}), rows({{0}, {1}}), rows({{1, 0}})));
  };
  CHECK_THAT(refusal([&] { at(0.0); }), Contains("pole -1 ") && Contains("condition"));
  // Columns an angle `gap` apart: condition 2 / gap.
  CHECK(at(1e-4).condition == Approx(2e4).epsilon(1e-3));
  CHECK(at(1e-4).warning.empty());
  CHECK_THAT(at(1e-6).warning, Contains("parallel") && Contains("digits"));
}
