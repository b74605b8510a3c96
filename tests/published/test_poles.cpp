// Poles of the published machines: the fifth-order model linearised by dual numbers, and the electrical ones in closed form.
#include <catch2/catch.hpp>

#include <Eigen/Eigenvalues>
#include <complex>

#include "plant/drive.hpp"
#include "plant/math/dual.hpp"
#include "plant/steady_state.hpp"
#include "tests/published/machines.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

using Pole = std::complex<double>;

// Fluxes and speed (mechanical) in the frame that turns at w_s: d psi/dt = stationary derivative - j w_s psi.
std::vector<Pole> fifth_order_poles(const Published& p) {
  using D = Dual<double, 5>;
  const double w = 2.0 * 3.14159265358979323846 * p.frequency, peak = p.line_voltage * std::sqrt(2.0 / 3.0);
  const SteadyState at = steady_at_slip(p.circuit, peak, w, p.slip);
  std::array<double, 5> x0{at.flux.stator.x, at.flux.stator.y, at.flux.rotor.x, at.flux.rotor.y,
                           at.electrical_speed / p.circuit.pole_pairs};
  std::array<D, 5> x;
  for (std::size_t i = 0; i < 5; ++i) x[i] = D::variable(x0[i], i);
  const Machine<D> m = in_number<Machine<D>, D>(make_machine(p.circuit));
  const MachineFlux<D> psi{{x[0], x[1]}, {x[2], x[3]}};
  const Vec2<D> i_s = stator_current(m, psi);
  const MachineFlux<D> d = flux_derivative(m, psi, i_s, {D(peak), D(0.0)}, m.pole_pairs * x[4]);
  const Vec2<D> ds = d.stator - D(w) * quarter_turn(psi.stator), dr = d.rotor - D(w) * quarter_turn(psi.rotor);
  const D dw = D(1.0 / p.inertia) * torque(m, psi, i_s);
  const std::array<D, 5> f{ds.x, ds.y, dr.x, dr.y, dw};
  Eigen::Matrix<double, 5, 5> jacobian;
  for (int i = 0; i < 5; ++i) {
    for (int j = 0; j < 5; ++j) jacobian(i, j) = f[static_cast<std::size_t>(i)].slope[static_cast<std::size_t>(j)];
  }
  const auto values = jacobian.eigenvalues();
  return {values.data(), values.data() + 5};
}

void check_contains(const std::vector<Pole>& found, Pole expected, double tolerance) {
  double best = 1e300;
  for (const Pole& f : found) best = std::min(best, std::abs(f - expected));
  INFO("pole " << expected);
  CHECK(best < tolerance);
}

}  // namespace

TEST_CASE("poles: fifth-order model of the published machines", "[published][plant]") {
  // Krause, Wasynczuk, Sudhoff, table "Induction machine eigenvalues" prints three digits; these are the same, computed from
  // the circuit by SciPy to the digits shown. Tolerance: half the last digit, twice over.
  struct Row {
    Published machine;
    double real;
    Pole slow, fast;
  };
  const std::array<Row, 6> rows{{{krause_3hp(), -16.8288, {-223.1720, 83.8995}, {-85.6042, 313.1899}},
                                 {krause_50hp(), -14.3937, {-142.2583, 42.4602}, {-49.3983, 355.9521}},
                                 {krause_500hp(), -27.5014, {-15.4236, 41.5409}, {-41.7782, 373.8327}},
                                 {barut_3kw(), -88.4260, {-43.5436, 109.9248}, {-116.0570, 280.1625}},
                                 {hinkkanen_2kw(), -74.2467, {-19.7525, 115.2674}, {-203.9196, 282.4068}},
                                 {krishnan_5hp(), -46.2744, {-20.8994, 121.9090}, {-80.6657, 368.1864}}}};
  for (const Row& row : rows) {
    INFO(row.machine.name);
    const auto poles = fifth_order_poles(row.machine);
    for (const Pole& pole : {Pole(row.real), row.slow, std::conj(row.slow), row.fast, std::conj(row.fast)})
      check_contains(poles, pole, 1e-4);
  }
}

TEST_CASE("poles: electrical ones at constant speed solve the published quadratic", "[published][plant]") {
  // Krause 3 hp, stationary frame: s^2 + (1/(sigma Ts) + 1/(sigma Tr) - j w) s + (1/(sigma Ts)) (1/Tr - j w) = 0, derived; values
  // computed from it to the digits shown.
  const Machine<double> m = make_machine(krause_3hp().circuit);
  struct Row {
    double w;
    Pole a, b;
  };
  const std::array<Row, 3> rows{{{0.0, {-4.0300703412, 0.0}, {-313.1605932755, 0.0}},
                                 {100.0, {-305.7676791079, 66.4097458}, {-11.4229845088, 33.5902542}},
                                 {358.1415625, {-232.6140777, 295.9241055}, {-84.5765859, 62.2174570}}}};
  for (const Row& row : rows) {
    // The two complex states by probing the right-hand side with unit fluxes.
    Eigen::Matrix2cd a;
    for (int column = 0; column < 2; ++column) {
      const MachineFlux<double> unit{{column == 0 ? 1.0 : 0.0, 0.0}, {column == 1 ? 1.0 : 0.0, 0.0}};
      const MachineFlux<double> d = flux_derivative(m, unit, stator_current(m, unit), {}, row.w);
      a(0, column) = Pole(d.stator.x, d.stator.y);
      a(1, column) = Pole(d.rotor.x, d.rotor.y);
    }
    const Eigen::Vector2cd values = Eigen::ComplexEigenSolver<Eigen::Matrix2cd>(a).eigenvalues();
    const std::vector<Pole> found{values(0), values(1)};
    check_contains(found, row.a, 1e-6);  // digits shown
    check_contains(found, row.b, 1e-6);
  }
}
