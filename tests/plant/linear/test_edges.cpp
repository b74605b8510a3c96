#include <catch2/catch.hpp>

#include "plant/linear/balance.hpp"
#include "plant/linear/decomposition.hpp"
#include "plant/linear/discretise.hpp"
#include "plant/linear/gramians.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/pbh.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/staircase.hpp"
#include "plant/linear/transfer.hpp"
#include "plant/linear/zeros.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

// Everything that is asked of a system; what throws must throw a LinearError.
void ask_all(const System& s) {
  const auto may_refuse = [](auto&& f) {
    try {
      f();
    } catch (const LinearError& error) {
      CHECK(std::string(error.what()).size() > 20);
    }
  };
  CHECK(modes_of(s).size() == static_cast<std::size_t>(s.order()));
  CHECK_FALSE(stability_of(s).why.empty());
  CHECK(pbh(s).size() == static_cast<std::size_t>(s.order()));
  CHECK(ranks_of(s).controllable <= s.order());
  stabilisable(s);
  detectable(s);
  CHECK(kalman_form(s).T.rows() == s.order());
  CHECK(transfer_difference(s, minimal(s).system) < 1e-9);
  transmission_zeros(s);
  may_refuse([&] { balanced(s); });
  may_refuse([&] { gramians(s); });
  may_refuse([&] { modal_form(s); });
  may_refuse([&] { dc_gain(s); });
  if (!s.discrete())
    for (const auto d : {Discretisation::zero_order_hold, Discretisation::euler, Discretisation::tustin}) {
      CHECK(discretise(s, 1e-3, d).order() == s.order());
      discretisation_error(s, 1e-3, d);
    }
}

}  // namespace

TEST_CASE("edges: every question has an answer or a sentence for small and empty systems", "[linear]") {
  for (const double period : {0.0, 0.5})
    for (const Eigen::Index n : {0, 1, 2, 3})
      for (const Eigen::Index m : {0, 1, 2})
        for (const Eigen::Index p : {0, 1, 2}) {
          CAPTURE(period, n, m, p);
          const Matrix zero = Matrix::Zero(n, n), b = Matrix::Ones(n, m), c = Matrix::Ones(p, n);
          ask_all(system_of(zero, Matrix::Zero(n, m), Matrix::Zero(p, n), period));
          ask_all(system_of(zero, b, c, period));
          ask_all(system_of(-0.5 * Matrix::Identity(n, n), b, c, period));
          Matrix chain = zero;
          for (Eigen::Index i = 0; i + 1 < n; ++i) chain(i, i + 1) = 1.0;
          ask_all(system_of(chain, b, c, period));
        }
}

TEST_CASE("edges: zero matrices reach nothing and show nothing", "[linear]") {
  const System s = system_of(Matrix::Zero(2, 2), Matrix::Zero(2, 1), Matrix::Zero(1, 2));
  CHECK(ranks_of(s).controllable == 0);
  CHECK(minimal(s).system.order() == 0);
  CHECK(minimal(s).removed.size() == 2);
  CHECK_FALSE(stabilisable(s));
}

TEST_CASE("edges: units from 1e-9 to 1e9 change no rank, pole or gain", "[linear]") {
  // A chain with an uncontrollable fourth state, then states in units up to 1e9 apart and inputs in others.
  const System plain = system_of(rows({{-1, 2, 0, 1}, {0, -3, 1, 0}, {1, 0, -2, 1}, {0, 0, 0, -5}}),
                                 rows({{0, 1}, {0, 1}, {1, 0}, {0, 0}}), rows({{1, 0, 0, 1}}));
  System wild = plain;
  const Vector unit = rows({{1e9, 1, 1e-9, 1e5}}).transpose();
  wild.A = unit.asDiagonal() * plain.A * unit.cwiseInverse().asDiagonal();
  wild.B = unit.asDiagonal() * plain.B;
  wild.B.col(0) *= 1e-9;
  wild.C = plain.C * unit.cwiseInverse().asDiagonal();
  CHECK(ranks_of(plain).controllable == 3);
  CHECK(ranks_of(wild).controllable == 3);
  CHECK(ranks_of(wild).observable == 4);
  CHECK(minimal(wild).system.order() == 3);
  CHECK_THAT(minimal(wild).removed.at(0), Contains("pole -5 in x4"));
  const auto a = modes_of(plain), b = modes_of(wild);
  // Balanced by powers of two the two differ by the roundings of the units alone.
  for (std::size_t i = 0; i < 4; ++i) CHECK(std::abs(a[i].pole - b[i].pole) < 1e-12);
  CHECK(dc_gain(wild)(0, 1) == Approx(dc_gain(plain)(0, 1)).epsilon(1e-12));
  CHECK(dc_gain(wild)(0, 0) == Approx(1e-9 * dc_gain(plain)(0, 0)).epsilon(1e-12));
}

TEST_CASE("edges: where balanced and given units disagree on a rank, that is said", "[linear]") {
  // The entry 1e-17 beside ones may be a unit or rounding.
  const System s = system_of(rows({{-1, 1e-17}, {0, -2}}), rows({{0}, {1}}), rows({{1, 0}}));
  CHECK(ranks_of(s).controllable == 2);
  CHECK_THAT(ranks_of(s).warning, Contains("may be rounding"));
}

TEST_CASE("balancing: exact, and only powers of two", "[linear]") {
  const System s = system_of(rows({{1, 1e6}, {3e-7, 2}}), rows({{5}, {0}}), rows({{0, 1e-4}}));
  const BalancedUnits b = in_balanced_units(s);
  const Matrix back = b.state.asDiagonal() * b.system.A * b.state.cwiseInverse().asDiagonal();
  CHECK(back == s.A);
  CHECK(b.output.asDiagonal() * b.system.C * b.state.cwiseInverse().asDiagonal() == s.C);
  CHECK(b.system.A(0, 1) / b.system.A(1, 0) < 10.0);
}
