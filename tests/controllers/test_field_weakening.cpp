// Field weakening: voltage inside its margin, torque that is there, smooth passage.
#include <catch2/catch.hpp>
#include <cmath>

#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {
double circle(const ClosedLoop& loop) { return voltage_limit(loop.constants.current, loop.dc_link); }
}  // namespace

// 0.7 rated torque over the speed ratio, i.e. 0.7 rated power, at 150 and 200 % of rated speed. The stator's drop
// is taken as if it lay along the back-EMF, so the voltage ends at or below the margin; 1 % for the drop's d part.
TEST_CASE("field weakening: 150 and 200 % of rated speed at 0.7 rated power", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const double ratio : {1.5, 2.0, -2.0}) {
      ControllerSetup setup = setup_for(truth);
      ClosedLoop loop(truth, setup);
      const double goal = ratio * truth.nameplate.speed_rad_s();
      loop.measured.speed_reference = goal;
      double peak_speed = 0.0, peak_current = 0.0;
      for (int k = 0; k < 30000; ++k) {
        if (k == 25000) loop.load_torque = 0.7 * truth.nameplate.torque_Nm / ratio;
        loop.step();
        peak_speed = max(peak_speed, loop.speed / goal);
        peak_current = max(peak_current, magnitude(loop.current()));
      }
      INFO(truth.name << " at " << ratio << ": |u| " << magnitude(loop.mean_voltage()) / circle(loop)
                      << " of the circle");
      CHECK(peak_speed < 1.01);
      CHECK(peak_current < 1.05 * loop.constants.flux.current_limit);
      CHECK(loop.speed == Approx(goal).epsilon(1e-3));
      CHECK(magnitude(loop.mean_voltage()) < 1.01 * loop.constants.flux.margin * circle(loop));
      CHECK(magnitude(loop.mean_voltage()) > 0.95 * loop.constants.flux.margin * circle(loop));
      CHECK(loop.command.clipped == 0.0);
      CHECK(std::fabs(loop.angle_error()) * 57.29578 < 0.01);
      const double steady = RotorFluxOriented::steady_rotor_flux(loop.constants, loop.dc_link, goal, loop.load_torque);
      CHECK(loop.rotor_flux() == Approx(steady).epsilon(2e-3));  // bow of the current: 0.1 % a period at 120 Hz
      CHECK(loop.rotor_flux() < 0.75 * truth.rotor_flux_Wb);
    }
  }
}

// All the torque asked for: current at its limit I on the ellipse (L_s i_d)^2 + (L_sigma i_q)^2 = (u_av / w_s)^2, or at
// pull-out, i_d = u_av / (sqrt 2 w_s L_s), i_q = margin U / (sqrt 2 w_s L_sigma), where that needs less current.
TEST_CASE("field weakening: torque available is the voltage ellipse's", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const double ratio : {1.5, 2.0}) {
      ControllerSetup setup = setup_for(truth);
      setup.speed_control = false;
      ClosedLoop loop(truth, setup);
      loop.speed_imposed = true;
      loop.speed = ratio * truth.nameplate.speed_rad_s();
      loop.measured.torque_reference = 1e4;
      double peak_current = 0.0;
      for (int k = 0; k < 15000; ++k) {
        loop.step();
        peak_current = max(peak_current, magnitude(loop.current()));
      }
      const auto& c = loop.constants.flux;
      const Vec2<double> i = loop.mean_current_dq();
      const double w = loop.state.orientation.stator_frequency, I = c.current_limit;
      const double u_av = c.margin * circle(loop) - c.R_s * magnitude(loop.command.current_reference);
      const double left = std::pow(u_av / w, 2) - std::pow(c.leakage * loop.command.current_reference.y, 2);
      const double i_d = std::sqrt(max(left, 0.5 * std::pow(u_av / w, 2))) / c.L_s;
      const double pull_out = c.margin * circle(loop) / (1.41421356 * w * c.leakage);
      const double i_q = min(std::sqrt(I * I - i_d * i_d), pull_out);
      INFO(truth.name << " at " << ratio << ": i " << i.x << " " << i.y << ", T " << loop.torque_now() << ", |u| "
                      << magnitude(loop.mean_voltage()) / circle(loop));
      CHECK(i.x == Approx(i_d).epsilon(0.01));
      CHECK(i.y == Approx(i_q).epsilon(0.01));
      CHECK(loop.torque_now() == Approx(loop.constants.torque_per_ampere * c.L_m * i_d * i_q).epsilon(0.02));
      CHECK(magnitude(loop.mean_voltage()) < 0.5 * (1.0 + c.margin) * circle(loop) * 1.01);
      CHECK(peak_current < 1.05 * I);
    }
  }
}

// Believed inductance or rotor resistance wrong: the trim takes the flux down until the voltage does again, so the
// speed is held and nothing is clipped once settled.
TEST_CASE("field weakening: wrong parameters leave the current loop its voltage", "[controllers][physics]") {
  for (const PublishedMachine& truth : {krause_3hp(), krishnan_5hp()}) {
    for (const double magnetizing : {0.85, 1.2}) {
      for (const double rotor : {0.7, 1.5}) {
        ControllerSetup setup = setup_for(truth);
        setup.circuit.magnetizing_inductance *= magnetizing;
        setup.circuit.rotor_resistance *= rotor;
        ClosedLoop loop(truth, setup);
        const double goal = 1.5 * truth.nameplate.speed_rad_s();
        loop.measured.speed_reference = goal;
        loop.run_for(2.0);
        loop.load_torque = 0.3 * truth.nameplate.torque_Nm;
        loop.run_for(1.5);
        int clipped = 0;
        for (int k = 0; k < 1000; ++k) {
          loop.step();
          clipped += loop.command.clipped > 0.5 ? 1 : 0;
        }
        INFO(truth.name << ", L_m x " << magnetizing << ", R_r x " << rotor << ", trim " << loop.state.flux.trim);
        CHECK(loop.speed == Approx(goal).epsilon(1e-3));
        CHECK(clipped == 0);
      }
    }
  }
}

// Planned to the very limit (margin 1) with dead time: the compensation still finds the voltage it adds, nothing is
// clipped.
TEST_CASE("field weakening: the limit leaves room for dead-time compensation", "[controllers][physics]") {
  const PublishedMachine truth = barut_3kW();
  ControllerSetup setup = setup_for(truth);
  setup.inverter.dead_time_s = 3e-6;
  Settings given;
  given.set("voltage_margin", 1.0);
  ClosedLoop loop(truth, setup, given);
  loop.leg = leg_error(3e-6, 10e3, 0.0, setup.inverter.zero_current_width_A);
  loop.measured.speed_reference = 1.5 * truth.nameplate.speed_rad_s();
  loop.load_torque = 0.0;
  loop.run_for(1.5);
  loop.load_torque = 0.4 * truth.nameplate.torque_Nm;
  loop.run_for(1.5);
  int clipped = 0;
  for (int k = 0; k < 500; ++k) {
    loop.step();
    clipped += loop.command.clipped > 0.5 ? 1 : 0;
  }
  CHECK(clipped == 0);
  CHECK(magnitude(loop.mean_voltage()) > 0.95 * circle(loop));
}

// Below base speed nothing is weakened.
TEST_CASE("field weakening: none at 80 % of rated speed", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    ControllerSetup setup = setup_for(truth);
    const auto c = RotorFluxOriented::prepare(setup, {});
    const double speed = 0.8 * truth.nameplate.speed_rad_s();
    CHECK(RotorFluxOriented::steady_rotor_flux(c, setup.inverter.dc_link_V, speed, 0.7 * truth.nameplate.torque_Nm) ==
          setup.rotor_flux_reference_Wb);
  }
}

// Braking from 200 %: generating raises no voltage that is not there, and flux comes back up without a swing in speed.
TEST_CASE("field weakening: braking from 200 % to rest", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    ClosedLoop loop(truth, setup_for(truth));
    loop.measured.speed_reference = 2.0 * truth.nameplate.speed_rad_s();
    loop.run_for(2.5);
    loop.measured.speed_reference = 0.0;
    double lowest = 0.0, peak_current = 0.0;
    for (int k = 0; k < 25000; ++k) {
      loop.step();
      lowest = min(lowest, loop.speed);
      peak_current = max(peak_current, magnitude(loop.current()));
    }
    INFO(truth.name);
    CHECK(lowest > -0.01 * truth.nameplate.speed_rad_s());
    CHECK(std::fabs(loop.speed) < 1e-3 * truth.nameplate.speed_rad_s());
    CHECK(loop.rotor_flux() == Approx(truth.rotor_flux_Wb).epsilon(2e-3));
    CHECK(peak_current < 1.05 * loop.constants.flux.current_limit);
  }
}
