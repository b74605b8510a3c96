// Current loop: step response, steady state, set-points, voltage limit, dead time.
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>

#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

constexpr double two_pi = 6.28318530717958647692;

// Torque control at an imposed speed, flux up.
ClosedLoop torque_drive(const PublishedMachine& truth, ControllerSetup setup, double speed,
                        const Settings& given = {}) {
  setup.speed_control = false;
  setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
  ClosedLoop loop(truth, setup, given);
  loop.speed_imposed = true;
  loop.speed = speed;
  loop.run_for(0.3);
  return loop;
}

}  // namespace

// Sampled internal-model loop with one period's delay (current_control.hpp): i(k+1) = i(k) + alpha_c T (r(k-1) -
// i(k-1)). The PI's zero is placed by forward Euler, at R T / L_sigma = 0.03 of a sample: 3 % of the step.
TEST_CASE("current loop: step response is the internal-model loop's", "[controllers][published]") {
  const PublishedMachine truth = krause_3hp();
  for (const double speed : {0.0, 80.0}) {
    for (const double bandwidth_Hz : {200.0, 400.0}) {
      Settings given;
      given.set("current_bandwidth_Hz", bandwidth_Hz);
      ClosedLoop loop = torque_drive(truth, setup_for(truth), speed, given);
      const double step_A = 5.0, before = loop.true_dq().y, alpha_T = two_pi * bandwidth_Hz * 1e-4;
      loop.measured.torque_reference = step_A * loop.constants.torque_per_ampere * loop.rotor_flux();
      double model = 0.0, model_before = 0.0, rise_model = -1.0, rise_true = -1.0;
      for (int k = 0; k < 120; ++k) {
        const double reached = (loop.true_dq().y - before) / step_A;
        INFO("tick " << k << " at " << bandwidth_Hz << " Hz, speed " << speed);
        REQUIRE(reached == Approx(model).margin(0.03));
        if (rise_true < 0.0 && reached > 0.9) rise_true = k;
        if (rise_model < 0.0 && model > 0.9) rise_model = k;
        loop.step();
        const double next = model + alpha_T * (k == 0 ? 0.0 : 1.0 - model_before);
        model_before = model;
        model = next;
      }
      CHECK(rise_true == Approx(rise_model).margin(1.0));  // one sample is the clock's own resolution
    }
  }
}

// With matched parameters feedforward, angle advance and voltage leave the resistive drop alone to the integral: x
// = R i. A half period's error of the advance would show as w T / 2 |u| = 2.9 V, the missing cross-coupling as w_s
// L_sigma i_q. Left: the vector's standing still, (w T)^2 / 24 |u| = 0.01 V, and the ripple of the sampled current:
// 1 % of R |i| = 15 V.
TEST_CASE("current loop: the integral carries the resistive drop alone", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const int d : {0, 1, 2}) {
      ControllerSetup setup = setup_for(truth);
      setup.delay_periods = d;
      ClosedLoop loop = torque_drive(truth, setup, 0.9 * truth.nameplate.speed_rad_s());
      loop.measured.torque_reference = 0.8 * truth.nameplate.torque_Nm;
      loop.run_for(1.0);
      const Vec2<double> drop = loop.constants.current.resistance * loop.command.current_reference;
      const Vec2<double> x = loop.state.current.integral;
      INFO(truth.name << ", delay " << d << ": x " << x.x << " " << x.y << ", R i " << drop.x << " " << drop.y);
      CHECK(magnitude(x - drop) < 0.01 * magnitude(drop));
    }
  }
}

// A q step at rated speed moves i_d only by what the delay leaves of the cross-coupling: w_s times the i_q that
// passes within (d + 1/2) T, w_s 1.5 T = 5.6 % of the step. Without decoupling it would be w_s / alpha_c = 15 %.
TEST_CASE("current loop: d and q are decoupled", "[controllers][physics]") {
  const PublishedMachine truth = krause_3hp();
  ClosedLoop loop = torque_drive(truth, setup_for(truth), truth.nameplate.speed_rad_s());
  const double before = loop.true_dq().x, step_A = 2.0;
  loop.measured.torque_reference = step_A * loop.constants.torque_per_ampere * loop.rotor_flux();
  double moved = 0.0;
  for (int k = 0; k < 100; ++k) {
    loop.step();
    moved = max(moved, std::fabs(loop.true_dq().x - before));
  }
  CHECK(loop.true_dq().y == Approx(step_A).epsilon(0.02));
  INFO("i_d moved by " << moved / step_A << " of the step");
  CHECK(moved < 0.056 * step_A);
}

// Integral action in the rotating frame: no error is left, whatever is believed. The loop's slowest pole after the
// zero, R / L_sigma, is above 90 1/s: 0.5 s leave e^-45. What remains is slow flux motion: 1e-4 of the current.
TEST_CASE("current loop: no steady error with wrong parameters", "[controllers][physics]") {
  const PublishedMachine truth = krause_3hp();
  for (const double factor : {0.7, 1.3}) {
    ControllerSetup setup = setup_for(truth);
    setup.circuit.stator_resistance *= factor;
    setup.circuit.stator_leakage *= factor;
    setup.circuit.rotor_leakage *= factor;
    setup.circuit.magnetizing_inductance *= 2.0 - factor;
    ClosedLoop loop = torque_drive(truth, setup, 120.0);
    loop.measured.torque_reference = 10.0;
    loop.run_for(1.5);
    const Vec2<double> model = loop.state.orientation.rotor_flux;
    const Vec2<double> seen = (1.0 / magnitude(model)) * seen_from(model, loop.state.orientation.current);
    INFO("factor " << factor);
    CHECK(seen.x == Approx(loop.command.current_reference.x).epsilon(1e-4));
    CHECK(seen.y == Approx(loop.command.current_reference.y).epsilon(1e-4));
  }
}

// Set-points of rotor-flux orientation, computed from the circuit: i_d = psi / L_m, i_q = T L_r / (3/2 p L_m psi),
// w_sl = R_r L_m i_q / (L_r psi), u_d, u_q. M1, psi 0.40 Wb, 11.9 N m, 1500 and 0 rpm. Means over a period, seen
// from the true flux. The vector's standing still costs (w T)^2 / 24 = 5e-5; orientation to 0.01 degrees turns u_d
// by 2e-4 of |u|.
TEST_CASE("current loop: published set-points are reached", "[controllers][published]") {
  struct Row {
    double rpm, slip, w_e, u_d, u_q, u;
  };
  for (const Row& row : {Row{1500.0, 20.23, 334.38926536, -10.9454086, 142.0535499, 142.47460479},
                         Row{0.0, 20.23, 20.23, 1.69633504, 12.76372687, 12.87595729}}) {
    const PublishedMachine truth = krause_3hp();
    ControllerSetup setup = setup_for(truth);
    setup.rotor_flux_reference_Wb = 0.40;
    ClosedLoop loop = torque_drive(truth, setup, row.rpm * two_pi / 60.0);
    loop.measured.torque_reference = 11.9;
    loop.run_for(1.0);
    const Vec2<double> before = loop.psi.rotor;
    loop.step();
    const double w_e = atan2(cross(before, loop.psi.rotor), dot(before, loop.psi.rotor)) / setup.control_period_s;
    const Vec2<double> i = loop.mean_current_dq(), u = loop.mean_voltage_dq();
    INFO(row.rpm << " rpm");
    CHECK(i.x == Approx(5.77100832).epsilon(3e-4));
    CHECK(i.y == Approx(10.20281924).epsilon(3e-4));
    CHECK(w_e == Approx(row.w_e).epsilon(3e-4));
    CHECK(w_e - 2.0 * row.rpm * two_pi / 60.0 == Approx(row.slip).epsilon(1e-3));
    CHECK(u.x == Approx(row.u_d).margin(3e-4 * row.u));
    CHECK(u.y == Approx(row.u_q).epsilon(3e-4));
    CHECK(magnitude(u) == Approx(row.u).epsilon(3e-4));
  }
}

// While the DC link is down to 60 % at rated speed the voltage limit holds; when it is back the currents must return
// without swinging out. Bound on the current: the limit plus a tenth; on the return: within 5 % of where it was in
// 50 ms, five times the current loop's zero L_sigma / R, which the back-calculation follows.
TEST_CASE("current loop: voltage limit and anti-windup", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const Modulation kind : {Modulation::space_vector, Modulation::sine, Modulation::discontinuous}) {
      ControllerSetup setup = setup_for(truth);
      setup.modulation = kind;
      ClosedLoop loop = torque_drive(truth, setup, 0.8 * truth.nameplate.speed_rad_s());
      loop.measured.torque_reference = 0.7 * truth.nameplate.torque_Nm;
      loop.run_for(0.3);
      const double torque_before = loop.torque_now(), link = loop.dc_link, limit = loop.constants.flux.current_limit;
      int clipped = 0;
      double peak = 0.0;
      loop.dc_link = 0.6 * link;
      for (int k = 0; k < 500; ++k) {
        loop.step();
        clipped += loop.command.clipped > 0.5 ? 1 : 0;
        peak = max(peak, magnitude(loop.current()));
        const double reach = linear_limit(kind) * loop.dc_link * (1.0 + 1e-9);
        if (k > 2) REQUIRE(magnitude(loop.mean_voltage()) < reach);
      }
      INFO(truth.name << ", modulation " << static_cast<int>(kind));
      CHECK(clipped > 0);
      loop.dc_link = link;
      for (int k = 0; k < 6000; ++k) {
        loop.step();
        peak = max(peak, magnitude(loop.current()));
      }
      CHECK(peak < 1.1 * limit);
      CHECK(loop.torque_now() == Approx(torque_before).epsilon(0.01));
      CHECK(loop.command.clipped == 0.0);
    }
  }
}

// Dead time 2 us, 10 kHz, 20 Hz stator frequency. Uncompensated, the voltage missing is the square wave's fundamental
// (4/pi) V_dc t_d f_sw (S.-G. Jeong, M.-H. Park, 1991), its fifth a fifth of that; compensated, a tenth may be
// left: the sign is the reference current's at the period's middle, true within a period's turn of a crossing, 0.7
// degrees.
TEST_CASE("current loop: dead-time compensation takes out the error", "[controllers][published]") {
  const PublishedMachine truth = barut_3kW();
  double fundamental[2], fifth[2], ripple[2];
  for (const int on : {0, 1}) {
    ControllerSetup setup = setup_for(truth);
    setup.inverter.dead_time_s = 2e-6;
    setup.inverter.zero_current_width_A = 0.02;
    setup.compensate_dead_time = on == 1;
    const double torque = 10.0, flux = setup.rotor_flux_reference_Wb;
    const double slip = 2.0 / 3.0 * truth.circuit.rotor_resistance * torque / (2.0 * flux * flux);
    ClosedLoop loop = torque_drive(truth, setup, (two_pi * 20.0 - slip) / 2.0);
    loop.leg = leg_error(2e-6, 10e3, 0.0, 0.02);
    loop.measured.torque_reference = torque;
    loop.run_for(1.0);
    const int n = 500;  // one period of 20 Hz
    std::complex<double> h1, h5;
    double least = 1e9, most = 0.0;
    for (int k = 0; k < n; ++k) {
      loop.step();
      // What the duties alone would give in the period just past: the command of the tick before (d = 1).
      const Vec2<double> meant = loop.state.current.commanded[1], got = loop.mean_voltage();
      const std::complex<double> error(got.x - meant.x, got.y - meant.y);
      h1 += error * std::polar(1.0 / n, -two_pi * k / n);
      h5 += error * std::polar(1.0 / n, 5.0 * two_pi * k / n);
      least = min(least, loop.true_dq().y);
      most = max(most, loop.true_dq().y);
    }
    fundamental[on] = std::abs(h1);
    fifth[on] = std::abs(h5);
    ripple[on] = most - least;
  }
  const double e = 1.15 * 1.41421356237 * 380.0 * 2e-6 * 10e3;
  INFO("fundamental " << fundamental[0] << " -> " << fundamental[1] << " V, fifth " << fifth[0] << " -> " << fifth[1]
                      << " V, i_q ripple " << ripple[0] << " -> " << ripple[1] << " A");
  // Current ripple and the width of the crossing move edges a little: 2 %, and 5 % of the fifth.
  CHECK(fundamental[0] == Approx(4.0 / 3.14159265358979 * e).epsilon(0.02));
  CHECK(fifth[0] == Approx(4.0 / 3.14159265358979 * e / 5.0).epsilon(0.05));
  CHECK(fundamental[1] < 0.1 * fundamental[0]);
  CHECK(fifth[1] < 0.1 * fifth[0]);
  CHECK(ripple[1] < 0.2 * ripple[0]);
}

// No delay, and two periods of it: the command stands where it should, so orientation and currents are as with one.
TEST_CASE("current loop: delays of none and two periods", "[controllers][physics]") {
  for (const int d : {0, 2}) {
    const PublishedMachine truth = krause_3hp();
    ControllerSetup setup = setup_for(truth);
    setup.delay_periods = d;
    ClosedLoop loop = torque_drive(truth, setup, truth.nameplate.speed_rad_s());
    loop.measured.torque_reference = 8.0;
    loop.run_for(1.0);
    INFO("delay " << d);
    CHECK(std::fabs(loop.angle_error()) * 57.29578 < 0.01);
    CHECK(loop.torque_now() == Approx(8.0).epsilon(2e-3));
  }
}

// At half of rated speed the circle is far away. With discontinuous modulation the compensation is off by one leg's dead time
// whenever the tied leg changes: an error, but no limit.
TEST_CASE("current loop: nothing counts as clipped inside the voltage limit", "[controllers][physics]") {
  for (const Modulation kind : {Modulation::space_vector, Modulation::sine, Modulation::discontinuous}) {
    const PublishedMachine truth = barut_3kW();
    ControllerSetup setup = setup_for(truth);
    setup.modulation = kind;
    setup.inverter.dead_time_s = 2e-6;
    setup.inverter.device_drop_V = 1.0;
    ClosedLoop loop = torque_drive(truth, setup, 0.5 * truth.nameplate.speed_rad_s());
    loop.leg = leg_error(2e-6, 10e3, 1.0, setup.inverter.zero_current_width_A);
    loop.measured.torque_reference = 0.7 * truth.nameplate.torque_Nm;
    loop.run_for(0.5);
    int clipped = 0;
    for (int k = 0; k < 2000; ++k) {
      loop.step();
      clipped += loop.command.clipped > 0.5 ? 1 : 0;
    }
    INFO("modulation " << static_cast<int>(kind));
    CHECK(clipped == 0);
  }
}
