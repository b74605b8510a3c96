// Orientation: matched model against the true flux, detuned model against the closed form, direct against indirect.
#include <catch2/catch.hpp>
#include <cmath>

#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

// Rotor of the true circuit with a stator current I e^{j angle(t)} whose angle runs straight over a period: RK4 in 20.
Vec2<double> rotor_after(const Circuit<double>& c, Vec2<double> psi, const Vec2<double>& i_dq, double angle,
                         double turn, double electrical_speed, double T) {
  const double tau = c.rotor_inductance() / c.rotor_resistance, L_m = c.magnetizing_inductance;
  const int n = 20;
  const double h = T / n;
  const auto rate = [&](double at, const Vec2<double>& x) {
    const double a = angle + turn * at / T;
    const Vec2<double> i = turn_forward({std::sin(a), std::cos(a)}, i_dq);
    return (1.0 / tau) * (L_m * i - x) + electrical_speed * quarter_turn(x);
  };
  for (int s = 0; s < n; ++s) {
    const double t = s * h;
    const Vec2<double> a = rate(t, psi), b = rate(t + 0.5 * h, psi + 0.5 * h * a);
    const Vec2<double> d = rate(t + 0.5 * h, psi + 0.5 * h * b), e = rate(t + h, psi + h * d);
    psi = psi + (h / 6.0) * (a + 2.0 * b + 2.0 * d + e);
  }
  return psi;
}

struct Detuned {
  double torque, flux, angle_deg;
};

// Currents imposed in the controller's frame, speed imposed; ratios of true to commanded torque and flux once settled.
Detuned imposed_currents(double kappa, double x) {
  const PublishedMachine truth = krause_3hp();
  ControllerSetup believed = setup_for(truth);
  believed.circuit.rotor_resistance = kappa * truth.circuit.rotor_resistance;  // tau_r / tau_r* = kappa
  const auto c = RotorFluxOriented::prepare(believed, {}).orientation;
  const double L_m = truth.circuit.magnetizing_inductance, T = believed.control_period_s, w = 60.0;
  const Vec2<double> i_dq{0.4 / L_m, x * 0.4 / L_m};
  OrientationState<double> s;
  s.rotor_flux = {0.4, 0.0};
  Vec2<double> psi{0.4, 0.0};
  Measurement<double> m;
  m.speed = w;
  double angle = 0.0;
  RotorFrame<double> f;
  const int ticks = 20000;  // 2 s, more than 15 time constants of the slowest case
  for (int k = 0; k < ticks; ++k) {
    m.current = turn_forward({std::sin(angle), std::cos(angle)}, i_dq);
    f = orient(s, c, m, Vec2<double>{}, k == 0);
    angle = std::atan2(f.angle.sin, f.angle.cos);
    if (k + 1 == ticks) break;
    const double turn = f.stator_frequency * T;
    psi = rotor_after(truth.circuit, psi, i_dq, angle, turn, 2.0 * w, T);
    angle += turn;
  }
  const Vec2<double> i = turn_forward(f.angle, i_dq);
  const double commanded = 0.4 * i_dq.y;  // psi* i_q*; the factor 3/2 p L_m / L_r is common
  const Vec2<double> model = s.rotor_flux;
  return {cross(psi, i) / commanded, magnitude(psi) / 0.4,
          std::atan2(cross(psi, model), dot(psi, model)) * 57.295779513};
}

}  // namespace

// Closed form of detuned indirect orientation: R. Krishnan, F.C. Doran, IEEE Trans. Ind. Appl. 23(4), 1987; figures
// of the published table for kappa = tau_r / tau_r*, x = i_q* / i_d*. Demanded: 0.1 %. Six printed digits: 2e-6.
// The time discretisation adds (w_s T)^2 / 12 at most, 2e-5 at 130 rad/s and 100 us: 5e-5 is asked.
TEST_CASE("orientation: detuned torque, flux and angle equal the closed form", "[controllers][published]") {
  struct Row {
    double x, kappa, torque, flux, angle_deg;
  };
  const Row rows[] = {{0.5, 0.5, 0.588235, 1.084652, -12.5288}, {0.5, 1.5, 1.2, 0.894427, 10.3048},
                      {1.0, 0.5, 0.8, 1.264911, -18.4349},      {1.0, 0.75, 0.96, 1.131371, -8.1301},
                      {1.0, 1.25, 0.975610, 0.883452, 6.3402},  {1.0, 2.0, 0.8, 0.632456, 18.4349},
                      {2.0, 0.5, 1.25, 1.581139, -18.4349},     {2.0, 0.75, 1.153846, 1.240347, -7.1250},
                      {2.0, 1.5, 0.75, 0.707107, 8.1301},       {2.0, 2.0, 0.588235, 0.542326, 12.5288}};
  for (const Row& row : rows) {
    const Detuned got = imposed_currents(row.kappa, row.x);
    INFO("kappa " << row.kappa << " x " << row.x << " T " << got.torque << " psi " << got.flux << " deg "
                  << got.angle_deg);
    CHECK(got.torque == Approx(row.torque).epsilon(5e-5));
    CHECK(got.flux == Approx(row.flux).epsilon(5e-5));
    // The table's angle is commanded frame behind true flux with the sign of atan(kappa x) - atan(x); ours is model
    // less truth: the same sign, since a current that is further ahead of the true flux sees it further behind.
    CHECK(got.angle_deg == Approx(row.angle_deg).margin(0.003));
  }
}

// The same through the whole loop: inverter, delay, current control. The frame and the torque demanded are the
// controller's own; currents are those it commands. 0.1 % is demanded.
TEST_CASE("orientation: detuned drive in closed loop meets the closed form", "[controllers][published]") {
  for (const double kappa : {0.75, 1.5}) {
    const PublishedMachine truth = krause_3hp();
    ControllerSetup believed = setup_for(truth);
    believed.circuit.rotor_resistance *= kappa;
    believed.speed_control = false;
    believed.rotor_flux_reference_Wb = believed.start_rotor_flux_Wb = 0.4;
    ClosedLoop loop(truth, believed);
    loop.speed_imposed = true;
    loop.speed = 100.0;
    const double x = 1.0, i_d = 0.4 / truth.circuit.magnetizing_inductance;
    const double torque = loop.constants.torque_per_ampere * 0.4 * x * i_d;
    loop.measured.torque_reference = torque;
    loop.run_for(1.5);
    INFO("kappa " << kappa);
    CHECK(loop.torque_now() / torque == Approx(kappa * (1 + x * x) / (1 + kappa * kappa * x * x)).epsilon(1e-3));
    CHECK(loop.rotor_flux() / 0.4 == Approx(std::sqrt((1 + x * x) / (1 + kappa * kappa * x * x))).epsilon(1e-3));
  }
}

// Matched parameters: what is left is the time discretisation, of order (w_s T)^2 / 12 of the current's angle,
// after the bow of the current within a period is taken out. Aim: 0.01 degrees.
TEST_CASE("orientation: matched model lies on the true flux", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const double share : {-0.5, 0.05, 0.5, 1.0}) {
      ControllerSetup setup = setup_for(truth);
      setup.speed_control = false;
      setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
      ClosedLoop loop(truth, setup);
      loop.speed_imposed = true;
      loop.speed = share * truth.nameplate.speed_rad_s();
      loop.measured.torque_reference = 0.7 * truth.nameplate.torque_Nm;
      loop.run_for(1.2);
      INFO(truth.name << " at " << share << ": " << loop.angle_error() * 57.29578 << " degrees");
      CHECK(std::fabs(loop.angle_error() * 57.29578) < 0.01);
      CHECK(magnitude(loop.state.orientation.rotor_flux) == Approx(loop.rotor_flux()).epsilon(1e-3));
    }
  }
}

// Given the true flux, direct orientation is the matched indirect one up to that 0.01 degrees: 0.1 % of torque and
// flux.
TEST_CASE("orientation: direct with the true flux equals indirect", "[controllers][physics]") {
  const PublishedMachine truth = barut_3kW();
  ControllerSetup indirect = setup_for(truth), direct = indirect;
  direct.direct_orientation = true;
  ClosedLoop a(truth, indirect), b(truth, direct);
  for (int k = 0; k < 8000; ++k) {
    const double reference = k < 1500 ? 0.0 : 100.0;
    a.measured.speed_reference = b.measured.speed_reference = reference;
    a.load_torque = b.load_torque = k < 4000 ? 0.0 : 10.0;
    a.step();
    b.step();
    REQUIRE(std::fabs(a.speed - b.speed) < 0.2);
  }
  CHECK(b.speed == Approx(100.0).epsilon(1e-4));
  CHECK(a.rotor_flux() == Approx(b.rotor_flux()).epsilon(1e-3));
  CHECK(a.torque_now() == Approx(b.torque_now()).epsilon(1e-3));
}

// A run that starts magnetised: model, current and integrals stand, so nothing may move. Rounding and the first
// periods' missing voltage leave little: 0.2 % of the flux.
TEST_CASE("orientation: a magnetised start stands still", "[controllers][physics]") {
  const PublishedMachine truth = krause_3hp();
  ControllerSetup setup = setup_for(truth);
  setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
  ClosedLoop loop(truth, setup);
  for (int k = 0; k < 2000; ++k) {
    loop.step();
    REQUIRE(loop.rotor_flux() == Approx(0.45).epsilon(2e-3));
    REQUIRE(std::fabs(loop.speed) < 1e-6);
  }
}
