// Start of the Krause 3 hp machine direct on line, no load, no friction, against a solution by DOP853 (SciPy) at rtol 1e-11,
// and energy and order of the same run.
#include <catch2/catch.hpp>

#include "plant/drive.hpp"
#include "sim/engine/steppers.hpp"
#include "tests/published/machines.hpp"
#include "tests/published/rows.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

struct Golden {
  double t, rpm, torque, i_alpha, i_beta, flux;
};
// Computed by DOP853 (SciPy), rtol 1e-11, atol 1e-12.
constexpr std::array<Golden, 8> golden{{{0.010, 52.770883, 130.871357, -90.495765, 30.060238, 0.48392711},
                                        {0.050, 291.129808, 42.788395, 66.307120, -58.544224, 0.29994223},
                                        {0.100, 549.367366, 79.049203, 50.698780, -47.576864, 0.39076205},
                                        {0.200, 1176.850308, 57.563651, 48.265166, -30.444979, 0.34675337},
                                        {0.300, 1637.786063, 25.164696, 18.685895, -9.769915, 0.43337492},
                                        {0.400, 1773.691748, 4.677572, 3.413983, -6.767756, 0.45877016},
                                        {0.500, 1796.191972, 0.690695, 0.592512, -6.680300, 0.46245486},
                                        {1.500, 1800.000000, 0.000000, 0.108085, -6.679893, 0.46305717}}};

Drive<double> start_drive() {
  const Published p = krause_3hp();
  Drive<double> d;
  d.machine = make_machine(p.circuit);
  d.shaft = {1.0 / p.inertia, 0.0, 0.0, 1.0};
  d.mains = make_mains(p.line_voltage, p.frequency, 0.0);
  return d;
}

// State of the start after `duration` with step h.
template <Stepper S>
DriveState<double> after(double duration, double h) {
  const Drive<double> d = start_drive();
  const DriveInput<double> in;
  DriveState<double> x{};
  const auto system = [&](const DriveState<double>& state, DriveState<double>& dx, double t) {
    dx = drive_derivative(d, in, state, t);
  };
  const auto steps = static_cast<std::int64_t>(std::llround(duration / h));
  for (std::int64_t n = 0; n < steps; ++n) odeint_step<S>(system, x, static_cast<double>(n) * h, h);
  return x;
}

double distance(const DriveState<double>& a, const DriveState<double>& b) {
  double sum = 0.0;
  for (std::size_t i = 0; i < 4; ++i) sum += (a[i] - b[i]) * (a[i] - b[i]);  // fluxes, all of one size
  return std::sqrt(sum);
}

template <Stepper S>
double order_between(double h) {
  // Against a solution whose own error is smaller by orders: cash_karp5 at 5 us.
  static const DriveState<double> exact = after<Stepper::cash_karp5>(0.04, 5e-6);
  return std::log2(distance(after<S>(0.04, h), exact) / distance(after<S>(0.04, h / 2.0), exact));
}

}  // namespace

TEST_CASE("direct-on-line start: equals the reference solution", "[published][plant]") {
  const Rows run = rows_of(on_mains(krause_3hp(), 1.5, 10e-6));
  // Bound: 1e-6 of each column's peak, the last digit printed.
  double peak_rpm = 0, peak_torque = 0, peak_i = 0, peak_flux = 0;
  for (const auto& row : run.rows) {
    peak_rpm = std::max(peak_rpm, std::fabs(row[P::speed_rpm]));
    peak_torque = std::max(peak_torque, std::fabs(row[P::torque]));
    peak_i = std::max(peak_i, std::fabs(row[P::i_alpha]));
    peak_flux = std::max(peak_flux, row[P::rotor_flux]);
  }
  double worst = 0.0;
  for (const Golden& g : golden) {
    const PlantRow& row = run.at(g.t);
    INFO("t = " << g.t);
    CHECK(std::fabs(row[P::speed_rpm] - g.rpm) < 1e-6 * peak_rpm);
    CHECK(std::fabs(row[P::torque] - g.torque) < 1e-6 * peak_torque);
    CHECK(std::fabs(row[P::i_alpha] - g.i_alpha) < 1e-6 * peak_i);
    CHECK(std::fabs(row[P::i_beta] - g.i_beta) < 1e-6 * peak_i);
    CHECK(std::fabs(row[P::rotor_flux] - g.flux) < 1e-6 * peak_flux);
    worst =
        std::max({worst, std::fabs(row[P::speed_rpm] - g.rpm) / peak_rpm,
                  std::fabs(row[P::torque] - g.torque) / peak_torque, std::fabs(row[P::i_alpha] - g.i_alpha) / peak_i,
                  std::fabs(row[P::i_beta] - g.i_beta) / peak_i, std::fabs(row[P::rotor_flux] - g.flux) / peak_flux});
  }
  WARN("worst error, share of the column's peak: " << worst);
}

TEST_CASE("steppers: halving the step shows each method's order on the drive", "[published][plant]") {
  // J.C. Butcher; E. Hairer, S.P. Norsett, G. Wanner, "Solving Ordinary Differential Equations I": orders 1, 2, 4, 5. At these
  // steps the next term is smaller by w h < 0.1 (for euler by some 0.02), so the observed exponent lies within 0.15; cash_karp5
  // needs 400 us to stay clear of rounding, w h = 0.15 and a fastest pole of 313 1/s, so 0.25.
  const double euler = order_between<Stepper::euler>(20e-6), midpoint = order_between<Stepper::midpoint>(100e-6),
               rk4 = order_between<Stepper::rk4>(200e-6), cash_karp = order_between<Stepper::cash_karp5>(400e-6);
  CHECK(std::fabs(euler - 1.0) < 0.15);
  CHECK(std::fabs(midpoint - 2.0) < 0.15);
  CHECK(std::fabs(rk4 - 4.0) < 0.15);
  CHECK(std::fabs(cash_karp - 5.0) < 0.25);
  WARN("observed orders: euler " << euler << ", midpoint " << midpoint << ", rk4 " << rk4 << ", cash_karp5 "
                                 << cash_karp);
}

TEST_CASE("energy: what goes in is stored, lost or delivered", "[published][plant]") {
  // States of the drive and five energies: input, stator and rotor copper, friction, load. The balance closes to the
  // integration error, for rk4 at 10 us (w h)^4 ~ 2e-10 a period of the fastest mode; 1e-9 of the input is asked for.
  Drive<double> d = start_drive();
  d.shaft.viscous = 0.002;
  d.load.fan = 1e-4;
  const DriveInput<double> in;
  using State = std::array<double, 11>;
  const auto split = [](const State& x) {
    DriveState<double> s;
    std::copy_n(x.begin(), 6, s.begin());
    return s;
  };
  const auto system = [&](const State& x, State& dx, double t) {
    const DriveState<double> s = split(x), ds = drive_derivative(d, in, s, t);
    std::copy(ds.begin(), ds.end(), dx.begin());
    const MachineFlux<double> psi = flux_of(s);
    const Vec2<double> i_s = stator_current(d.machine, psi), i_r = rotor_current(d.machine, psi),
                       u = source_voltage(d, in, t);
    dx[6] = 1.5 * dot(u, i_s);
    dx[7] = 1.5 * d.machine.R_s * dot(i_s, i_s);
    dx[8] = 1.5 * d.machine.R_r * dot(i_r, i_r);
    dx[9] = d.shaft.viscous * s[4] * s[4];
    dx[10] = total_load(d, in, s[4], t) * s[4];
  };
  State x{};
  const double h = 10e-6;
  for (std::int64_t n = 0; n < 150000; ++n) odeint_step<Stepper::rk4>(system, x, static_cast<double>(n) * h, h);
  const MachineFlux<double> psi = flux_of(split(x));
  const double magnetic =
      0.75 * (dot(psi.stator, stator_current(d.machine, psi)) + dot(psi.rotor, rotor_current(d.machine, psi)));
  const double kinetic = 0.5 * x[4] * x[4] / d.shaft.per_inertia;
  const double missing = x[6] - x[7] - x[8] - x[9] - x[10] - magnetic - kinetic;
  CHECK(x[6] > 1000.0);
  CHECK(std::fabs(missing) < 1e-9 * x[6]);
  WARN("energy missing: " << missing / x[6] << " of " << x[6] << " J put in");
}
