// Where speed can be seen: published line, rank, and the smallest singular values of the PBH test.
#include <Eigen/Dense>
#include <catch2/catch.hpp>

#include "plant/linear/lie.hpp"
#include "plant/linear/speed_observability.hpp"
#include "tests/published/machines.hpp"

using namespace slipbench;
using namespace slipbench::published;
using linear::Matrix;
using linear::SpeedModel;

namespace {

constexpr double flux = 0.45, torque_Nm = 8.0;

// Krause 3 hp with that flux and a torque, at stator frequency w_s.
linear::SpeedPoint at_frequency(double w_s, double torque = torque_Nm) {
  const Published p = krause_3hp();
  const double w_r = linear::speed_at_frequency(p.circuit, flux, torque, w_s);
  return linear::steady_speed_point(p.circuit, p.inertia, 0.0, flux, torque, w_r / p.circuit.pole_pairs);
}

const linear::PerUnit krause_unit{8.845 * 1.4142135623730951, 220.0 * 0.816496580927726 / 376.99111843077515,
                                  376.99111843077515, 14.03};

double least(const Eigen::MatrixXcd& m) {
  const Eigen::VectorXd values = Eigen::JacobiSVD<Eigen::MatrixXcd>(m).singularValues();
  return values(values.size() - 1);
}

// [A - s I; C] with the speed in electrical rad/s, as the published values have it. A from the constant-torque shaft or, `held`, w' = 0;
// `load`: the load torque appended as a state.
Eigen::MatrixXcd pencil(const linear::SpeedPoint& at, bool held, bool load, std::complex<double> s) {
  const linear::System m = linear::machine_on_shaft(at.machine, false);
  const double p = at.machine.circuit.pole_pairs;
  const Eigen::Index n = load ? 6 : 5;
  Matrix A = Matrix::Zero(n, n), C = Matrix::Zero(2, n);
  A.topLeftCorner(5, 5) = m.A;
  if (load) A.block(0, 5, 5, 1) = m.B.col(2);
  A.row(4) *= held ? 0.0 : p;
  A.col(4) /= p;
  C.leftCols(5) = m.C;
  Eigen::MatrixXcd pencil(n + 2, n);
  pencil << A.cast<std::complex<double>>() - s * Eigen::MatrixXcd::Identity(n, n), C.cast<std::complex<double>>();
  return pencil;
}

}  // namespace

// M. Ghanes, J. de Leon, A. Glumineau, CDC 2006; S. Ibarra-Rojas et al., Automatica 40(6), 2004, 1079-1085 (the facts, from memory); the
// numbers computed independently from the model, four digits shown: half of the last, twice over.
TEST_CASE("speed observability: smallest singular values of the PBH test", "[published][linear]") {
  CHECK(at_frequency(0.0).machine.speed_rad_s * 2.0 == Approx(-10.745679012345677).epsilon(1e-14));
  CHECK(least(pencil(at_frequency(0.0), true, false, 0.0)) < 1e-12);
  CHECK(least(pencil(at_frequency(0.0, 0.0), true, false, 0.0)) < 1e-12);
  CHECK(least(pencil(at_frequency(0.01), true, false, 0.0)) == Approx(2.616e-4).margin(1e-7));
  CHECK(least(pencil(at_frequency(1.0), true, false, 0.0)) == Approx(2.671e-2).margin(1e-5));
  CHECK(least(pencil(at_frequency(50.0), true, false, 0.0)) == Approx(0.3483).margin(1e-4));
  CHECK(least(pencil(at_frequency(0.0), false, true, 0.0)) < 1e-12);
  CHECK(least(pencil(at_frequency(1.0), false, true, 0.0)) == Approx(2.663e-2).margin(1e-5));
  // Known load: the least over the system's own modes.
  const auto known = at_frequency(0.0);
  double smallest = 1e300;
  for (const auto& s : linear::machine_on_shaft(known.machine, false).A.eigenvalues())
    smallest = std::min(smallest, least(pencil(known, false, false, s)));
  CHECK(smallest == Approx(0.0153).margin(1e-4));
}

TEST_CASE("speed observability: rank drops at zero stator frequency and recovers beside it", "[published][linear]") {
  for (const SpeedModel model : {SpeedModel::constant_speed, SpeedModel::unknown_load}) {
    INFO(linear::name_of(model));
    for (const double T : {-14.0, -3.0, 0.0, 8.0, 20.0}) {
      const auto lost = linear::speed_observability(at_frequency(0.0, T), model, krause_unit);
      CHECK(lost.smallest < 1e-10 * lost.largest);
      CHECK(lost.rank == lost.states - 1);
      for (const double w_s : {-50.0, -1.0, -0.01, 0.01, 1.0, 50.0}) {
        const auto seen = linear::speed_observability(at_frequency(w_s, T), model, krause_unit);
        INFO("w_s " << w_s << ", torque " << T << ": " << seen.smallest << " of " << seen.largest);
        CHECK(seen.rank == seen.states);
        // Near the line the loss is of first order: twice the frequency, twice the value.
        if (std::fabs(w_s) < 0.1) {
          const auto twice = linear::speed_observability(at_frequency(2.0 * w_s, T), model, krause_unit);
          CHECK(twice.smallest / seen.smallest == Approx(2.0).epsilon(0.02));
        }
      }
    }
  }
  const auto known = linear::speed_observability(at_frequency(0.0), SpeedModel::known_load, krause_unit);
  CHECK(known.rank == known.states);
  auto unknown_inertia = at_frequency(0.0);
  unknown_inertia.machine.inertia_kgm2 = 0.0;
  CHECK_THROWS_WITH(linear::speed_observability(unknown_inertia, SpeedModel::known_load, krause_unit),
                    Catch::Contains("inertia"));
}

TEST_CASE("lie rows: at an equilibrium they are C A^k / k!", "[linear]") {
  const auto at = at_frequency(30.0);
  const Matrix rows = linear::speed_observability_matrix(at, SpeedModel::known_load, {});
  const linear::System m = linear::machine_on_shaft(at.machine, false);
  const double p = at.machine.circuit.pole_pairs;
  Matrix A = m.A, block = m.C;
  A.row(4) *= p;
  A.col(4) /= p;
  for (Eigen::Index k = 0; k < 5; ++k) {
    const Matrix found = rows.middleRows(2 * k, 2);
    // Products of five matrices: rounding of some 1e-15 of the block's size.
    CHECK((found - block).norm() < 1e-12 * block.norm());
    block = (block * A / static_cast<double>(k + 1)).eval();
  }
}

TEST_CASE("lie rows: away from equilibrium, against Lie derivatives by hand", "[linear]") {
  // x_1' = x_1 x_2, x_2' = 0, y = x_1^2: y_k = (2 x_2)^k x_1^2 / k!.
  const auto f = []<class Real>(const std::array<Real, 2>& x) { return std::array<Real, 2>{x[0] * x[1], Real(0.0)}; };
  const auto h = []<class Real>(const std::array<Real, 2>& x) { return std::array<Real, 1>{x[0] * x[0]}; };
  const double a = 1.7, b = -0.6;
  const Matrix rows = linear::lie_rows<4>(f, h, std::array{a, b});
  double fact = 1.0;
  for (int k = 0; k <= 4; ++k) {
    if (k > 0) fact *= k;
    CHECK(rows(k, 0) == Approx(2.0 * a * std::pow(2.0 * b, k) / fact).epsilon(1e-14));
    CHECK(rows(k, 1) == Approx(k == 0 ? 0.0 : a * a * 2.0 * k * std::pow(2.0 * b, k - 1) / fact).epsilon(1e-14));
  }
}
