// Poles of the published machines: the fifth-order model linearised at its operating point, and the electrical ones in closed form.
#include <catch2/catch.hpp>

#include <Eigen/Eigenvalues>
#include <complex>

#include "plant/linear/machine_system.hpp"
#include "tests/published/machines.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

using Pole = std::complex<double>;

std::vector<Pole> poles_of(const linear::System& system) {
  const Eigen::VectorXcd values = system.A.eigenvalues();
  return {values.data(), values.data() + values.size()};
}

// On rated supply at the row's slip, no friction, in the synchronous frame.
linear::MachinePoint on_rated_supply(const Published& p) {
  const double w = 2.0 * 3.14159265358979323846 * p.frequency, peak = p.line_voltage * std::sqrt(2.0 / 3.0);
  linear::MachinePoint point = linear::point_of(p.circuit, steady_at_slip(p.circuit, peak, w, p.slip));
  point.inertia_kgm2 = p.inertia;
  return point;
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
    const auto poles = poles_of(linear::machine_on_shaft(on_rated_supply(row.machine), true));
    for (const Pole& pole : {Pole(row.real), row.slow, std::conj(row.slow), row.fast, std::conj(row.fast)})
      check_contains(poles, pole, 1e-4);
  }
}

TEST_CASE("poles: electrical ones at constant speed solve the published quadratic", "[published][plant]") {
  // Krause 3 hp, stationary frame: s^2 + (1/(sigma Ts) + 1/(sigma Tr) - j w) s + (1/(sigma Ts)) (1/Tr - j w) = 0, derived; values
  // computed from it to the digits shown.
  struct Row {
    double w;
    Pole a, b;
  };
  const std::array<Row, 3> rows{{{0.0, {-4.0300703412, 0.0}, {-313.1605932755, 0.0}},
                                 {100.0, {-305.7676791079, 66.4097458}, {-11.4229845088, 33.5902542}},
                                 {358.1415625, {-232.6140777, 295.9241055}, {-84.5765859, 62.2174570}}}};
  for (const Row& row : rows) {
    linear::MachinePoint point;
    point.circuit = krause_3hp().circuit;
    point.speed_rad_s = row.w / point.circuit.pole_pairs;
    const auto found = poles_of(linear::machine_at_speed(point));
    CHECK(found.size() == 4);
    for (const double frame : {100.0, -377.0}) {  // a frame that turns at w_k shifts them by -j w_k, some conjugated
      point.frame_frequency = frame;
      const auto turned = poles_of(linear::machine_at_speed(point));
      for (const Pole& pole : {row.a, row.b}) check_contains(turned, pole - Pole(0.0, frame), 1e-6);
    }
    check_contains(found, row.a, 1e-6);  // digits shown
    check_contains(found, row.b, 1e-6);
  }
}
