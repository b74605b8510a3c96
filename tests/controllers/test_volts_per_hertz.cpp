// Voltage/frequency control in closed loop with the machine, against the T circuit's steady state (P.C. Krause, O. Wasynczuk,
// S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed., 2002, ch. 4), written out here.
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>

#include "plant/steady_state.hpp"
#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

using Complex = std::complex<double>;
using Loop = ClosedLoopOf<VoltsPerHertz>;
constexpr double two_pi = 6.283185307179586477;

const std::array<PublishedMachine, 3> three{krause_3hp(), barut_3kW(), hinkkanen_2kW2()};

double held_flux(const PublishedMachine& m) {  // of the stator, at no load
  return m.rotor_flux_Wb * m.circuit.stator_inductance() / m.circuit.magnetizing_inductance;
}
double rated_electrical(const PublishedMachine& m) { return m.circuit.pole_pairs * m.nameplate.speed_rad_s(); }

struct Point {
  double torque, stator_flux, current;
};
// Rotor: 0 = (R_r + j w_slip L_r) i_r + j w_slip L_m i_s. Stator: u = R_s i_s + j w psi_s, psi_s = L_s i_s + L_m i_r.
Complex rotor_share(const Circuit<double>& c, double w_slip) {  // i_r / i_s
  return -Complex(0.0, w_slip * c.magnetizing_inductance) / Complex(c.rotor_resistance, w_slip * c.rotor_inductance());
}
Point at_current(const Circuit<double>& c, Complex i_s, double w_slip) {
  const Complex psi = (c.stator_inductance() + c.magnetizing_inductance * rotor_share(c, w_slip)) * i_s;
  return {1.5 * c.pole_pairs * std::imag(std::conj(psi) * i_s), std::abs(psi), std::abs(i_s)};
}
Point on_flux(const Circuit<double>& c, double stator_flux, double w_slip) {
  return at_current(c, stator_flux / (c.stator_inductance() + c.magnetizing_inductance * rotor_share(c, w_slip)),
                    w_slip);
}
Point on_voltage(const Circuit<double>& c, double voltage, double w, double w_slip) {
  const Complex reactance =
      Complex(0.0, w) * (c.stator_inductance() + c.magnetizing_inductance * rotor_share(c, w_slip));
  return at_current(c, voltage / (c.stator_resistance + reactance), w_slip);
}
// The stable slip that gives this torque, by halving from no slip up to pull-out.
template <class F>
double slip_at(double torque, double pull_out_slip, F&& torque_of) {
  double low = 0.0, high = std::copysign(pull_out_slip, torque);
  REQUIRE(std::fabs(torque_of(high)) > std::fabs(torque));
  for (int i = 0; i < 100; ++i) {
    const double middle = 0.5 * (low + high);
    (std::fabs(torque_of(middle)) < std::fabs(torque) ? low : high) = middle;
  }
  return low;
}
double slip_on_flux(const PublishedMachine& m, double stator_flux, double torque) {
  const Circuit<double>& c = m.circuit;
  const double sigma =
      1.0 - c.magnetizing_inductance * c.magnetizing_inductance / (c.stator_inductance() * c.rotor_inductance());
  const double pull_out = c.rotor_resistance / (sigma * c.rotor_inductance());
  return slip_at(torque, pull_out, [&](double w) { return on_flux(c, stator_flux, w).torque; });
}

// Magnetised at rest, then up to `speed_share` of rated speed; the load comes over a second after it.
Loop settled(const PublishedMachine& m, double speed_share, double torque_share, const Settings& given = {},
             ControllerSetup setup = {}) {
  if (setup.rotor_flux_reference_Wb == 0.0) setup = setup_for(m);
  setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
  Loop loop(m, setup, given);
  loop.measured.speed_reference = speed_share * m.nameplate.speed_rad_s();
  const double seconds = std::fabs(speed_share) * rated_electrical(m) / (loop.constants.ramp.most_step / 100e-6);
  loop.run_for(seconds + 0.2);
  for (int i = 0; i < 100; ++i) {
    loop.load_torque = torque_share * m.nameplate.torque_Nm * (i + 1) / 100.0;
    loop.run_for(0.01);
  }
  loop.run_for(2.5);
  return loop;
}
double stator_flux(const Loop& loop) { return magnitude(loop.psi.stator); }

Settings with(std::initializer_list<std::pair<const char*, double>> values) {
  Settings s;
  for (const auto& [name, value] : values) s.set(name, value);
  return s;
}

}  // namespace

TEST_CASE("volts per hertz: full slip compensation holds the speed", "[controllers][volts_per_hertz]") {
  // With parameters believed right what is left is settling: 2.5 s are more than ten times the slip filter, e^-10 of the load's
  // slip. 1e-3 of rated slip is 1e-4 of rated speed and below.
  for (const PublishedMachine& m : three) {
    const double rated_slip = slip_on_flux(m, held_flux(m), m.nameplate.torque_Nm);
    for (const double share : {0.15, 0.3, -0.6, 1.0}) {
      for (const double load : {0.0, 0.5, 1.0, -0.5}) {
        const Loop loop = settled(m, share, std::copysign(load, load * share));
        const double error = m.circuit.pole_pairs * (loop.speed - loop.measured.speed_reference) / rated_slip;
        INFO(m.name << ", " << share << " of rated speed, " << load << " of rated torque: " << error
                    << " of rated slip");
        CHECK(std::fabs(error) < 1e-3);
      }
    }
  }
}

TEST_CASE("volts per hertz: without compensation the speed falls by the circuit's slip", "[controllers][published]") {
  for (const PublishedMachine& m : three) {
    for (const double share : {0.3, 0.8}) {
      for (const double load : {0.5, 1.0, -0.7}) {
        const Loop loop = settled(m, share, load, with({{"slip_compensation", 0.0}}));
        const double expected = slip_on_flux(m, held_flux(m), load * m.nameplate.torque_Nm);
        const double drop = m.circuit.pole_pairs * (loop.measured.speed_reference - loop.speed);
        INFO(m.name << ", " << share << ", " << load << ": " << drop << " rad/s, circuit " << expected);
        // The vector stands still over a period: its harmonics and (w T)^2 / 24 = 4e-5; settling as above.
        CHECK(drop == Approx(expected).epsilon(1e-3));
      }
    }
  }
}

TEST_CASE("volts per hertz: boost holds the stator flux from 2 Hz to rated frequency", "[controllers][published]") {
  for (const PublishedMachine& m : three) {
    for (const double hz : {2.0, 5.0, 20.0, m.nameplate.frequency_Hz}) {
      for (const double load : {0.0, 0.5, 1.0}) {
        const double slip = slip_on_flux(m, held_flux(m), std::max(load, 1e-9) * m.nameplate.torque_Nm);
        if (slip > 0.8 * two_pi * hz) continue;  // the shaft would have to turn back
        const Loop loop = settled(m, (two_pi * hz - slip) / rated_electrical(m), load);
        INFO(m.name << ", " << hz << " Hz, load " << load << ": " << stator_flux(loop) / held_flux(m));
        CHECK(loop.state.stator_frequency ==
              Approx(two_pi * hz)
                  .margin(0.02 * slip_on_flux(m, held_flux(m), m.nameplate.torque_Nm) + 2e-3 * two_pi * hz));
        CHECK(stator_flux(loop) ==
              Approx(held_flux(m)).epsilon(2e-3));  // exact in theory; settling and the period's harmonics
      }
    }
  }
}

TEST_CASE("volts per hertz: without boost the flux falls as the circuit says", "[controllers][published]") {
  for (const PublishedMachine& m : three) {
    for (const double hz : {2.0, 5.0, 20.0}) {
      for (const double load : {0.0, 0.2}) {
        const double w = two_pi * hz, T = load * m.nameplate.torque_Nm;
        const auto torque_of = [&](double w_slip) { return on_voltage(m.circuit, w * held_flux(m), w, w_slip).torque; };
        const double pull_out = pull_out_slip(m.circuit, w) * w;
        if (load > 0.0 && torque_of(pull_out) < 1.2 * T) continue;  // it would stall
        const double slip = load > 0.0 ? slip_at(T, pull_out, torque_of) : 0.0;
        const Point expected = on_voltage(m.circuit, w * held_flux(m), w, slip);
        const Loop loop =
            settled(m, w / rated_electrical(m), load, with({{"ir_boost", 0.0}, {"slip_compensation", 0.0}}));
        INFO(m.name << ", " << hz << " Hz, load " << load << ": " << stator_flux(loop) << " Wb, circuit "
                    << expected.stator_flux << " Wb, held " << held_flux(m));
        CHECK(stator_flux(loop) == Approx(expected.stator_flux).epsilon(2e-3));
        CHECK(m.circuit.pole_pairs * loop.speed == Approx(w - slip).epsilon(2e-3));
        if (hz == 2.0) CHECK(stator_flux(loop) < 0.96 * held_flux(m));
      }
    }
  }
}

TEST_CASE("volts per hertz: half the boost, and the slip is still known", "[controllers][published]") {
  // The torque is reckoned with the flux that the missing boost leaves: the speed stays where it shall be.
  for (const PublishedMachine& m : three) {
    const Loop loop = settled(m, 0.3, 0.5, with({{"ir_boost", 0.5}}));
    const double rated_slip = slip_on_flux(m, held_flux(m), m.nameplate.torque_Nm);
    INFO(m.name);
    CHECK(stator_flux(loop) < 0.99 * held_flux(m));
    CHECK(m.circuit.pole_pairs * std::fabs(loop.speed - loop.measured.speed_reference) < 1e-2 * rated_slip);
  }
}

TEST_CASE("volts per hertz: a locked rotor draws the current limit, no more", "[controllers][volts_per_hertz]") {
  for (const PublishedMachine& m : three) {
    for (const double way : {1.0, -1.0}) {
      ControllerSetup setup = setup_for(m);
      setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
      Loop loop(m, setup, with({{"current_limit_peak_A", 1.5 * m.nameplate.peak_current_A()}}));
      loop.speed_imposed = true;
      loop.measured.speed_reference = way * m.nameplate.speed_rad_s();
      const double limit = loop.constants.ramp.limit;
      double worst = 0.0;
      for (int k = 0; k < 30000; ++k) {
        loop.step();
        worst = std::max(worst, magnitude(loop.current()) / limit);
      }
      INFO(m.name << ": worst " << worst << ", last " << magnitude(loop.current()) / limit);
      CHECK(worst < 1.1);
      CHECK(magnitude(loop.current()) == Approx(limit).epsilon(0.05));  // the ramp waits over the last tenth
      CHECK(way * loop.torque_now() > 0.8 * m.nameplate.torque_Nm);
    }
  }
}

TEST_CASE("volts per hertz: too steep a ramp and too heavy a load bend to the current limit",
          "[controllers][volts_per_hertz]") {
  for (const PublishedMachine& m : three) {
    ControllerSetup setup = setup_for(m);
    setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
    setup.inertia_kgm2 = 5.0 * m.inertia_kgm2;
    Loop loop(m, setup, with({{"frequency_ramp_Hz_per_s", 2000.0}}));
    loop.inertia = setup.inertia_kgm2;
    const double limit = loop.constants.ramp.limit;
    loop.measured.speed_reference = 0.8 * m.nameplate.speed_rad_s();
    double starting = 0.0, overloaded = 0.0;
    for (int k = 0; k < 120000; ++k) {
      loop.step();
      starting = std::max(starting, magnitude(loop.current()) / limit);
    }
    INFO(m.name << ": starting " << starting);
    CHECK(starting < 1.15);
    CHECK(loop.speed == Approx(loop.measured.speed_reference).epsilon(1e-3));
    loop.load_torque = 4.0 * m.nameplate.torque_Nm;
    for (int k = 0; k < 3000; ++k) {
      loop.step();
      overloaded = std::max(overloaded, magnitude(loop.current()) / limit);
    }
    INFO("overloaded " << overloaded);
    CHECK(overloaded < 1.2);
    CHECK(loop.speed < 0.9 * loop.measured.speed_reference);
    loop.load_torque = 0.0;
    loop.run_for(8.0);
    CHECK(loop.speed == Approx(loop.measured.speed_reference).epsilon(1e-3));
  }
}

TEST_CASE("volts per hertz: beyond the voltage the flux weakens by itself", "[controllers][volts_per_hertz]") {
  for (const PublishedMachine& m : three) {
    Loop loop = settled(m, 1.6, 0.25);
    const double limit = voltage_limit(loop.constants.legs, loop.dc_link);
    INFO(m.name);
    CHECK(loop.command.clipped == 0.0);
    CHECK(loop.speed == Approx(loop.measured.speed_reference).epsilon(1e-3));
    CHECK(stator_flux(loop) < 0.85 * held_flux(m));
    CHECK(magnitude(loop.mean_voltage()) == Approx(limit).epsilon(2e-3));  // a thousandth is left
    CHECK(loop.command.rotor_flux_reference == Approx(stator_flux(loop) * loop.constants.flux_ratio).epsilon(5e-3));
  }
}

TEST_CASE("volts per hertz: every modulation and delay, dead time compensated", "[controllers][volts_per_hertz]") {
  const PublishedMachine m = barut_3kW();
  for (const Modulation kind : {Modulation::space_vector, Modulation::sine, Modulation::discontinuous}) {
    for (const int delay : {0, 1, 2}) {
      ControllerSetup setup = setup_for(m);
      setup.modulation = kind;
      setup.delay_periods = delay;
      setup.inverter.dead_time_s = 2e-6;
      setup.inverter.device_drop_V = 1.0;
      setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
      Loop loop(m, setup);
      loop.leg = leg_error(2e-6, 10e3, 1.0, setup.inverter.zero_current_width_A);
      loop.measured.speed_reference = 0.2 * m.nameplate.speed_rad_s();
      loop.load_torque = 0.0;
      loop.run_for(1.0);
      loop.load_torque = 0.5 * m.nameplate.torque_Nm;
      loop.run_for(2.0);
      double flux = 0.0, speed = 0.0;
      for (int k = 0; k < 2000; ++k) {  // a whole number of turns of the ripple, near enough: 10 Hz, two periods
        loop.step();
        flux += stator_flux(loop) / 2000.0, speed += loop.speed / 2000.0;
      }
      INFO("modulation " << static_cast<int>(kind) << ", delay " << delay << ": flux " << flux / held_flux(m)
                         << ", speed " << speed / loop.measured.speed_reference);
      // 12 V of leg error against 55 V of flux voltage: what the crossing's width and the period's harmonics leave of it.
      CHECK(flux == Approx(held_flux(m)).epsilon(0.01));
      CHECK(speed == Approx(loop.measured.speed_reference).epsilon(0.01));
    }
  }
}

TEST_CASE("volts per hertz: from nothing it magnetises at rest before it turns", "[controllers][volts_per_hertz]") {
  for (const PublishedMachine& m : three) {
    Loop loop(m, setup_for(m));
    loop.leg = leg_error(2e-6, 10e3, 1.0, 0.2);  // a dead time that nobody believes in
    for (int k = 0; k < 10000; ++k) {
      loop.step();
      REQUIRE(magnitude(loop.current()) < 1.05 * loop.constants.ramp.limit);
    }
    INFO(m.name);
    CHECK(loop.rotor_flux() == Approx(m.rotor_flux_Wb).epsilon(0.02));  // flux loop's gain of 5 and its push
    CHECK(std::fabs(loop.speed) < 0.01 * m.nameplate.speed_rad_s());
    loop.leg = leg_error(0.0, 0.0, 0.0, 1.0);
    loop.measured.speed_reference = 0.5 * m.nameplate.speed_rad_s();
    loop.run_for(6.0);
    CHECK(loop.speed == Approx(loop.measured.speed_reference).epsilon(1e-4));
  }
}

TEST_CASE("volts per hertz: damping quiets a voltage-fed machine", "[controllers][volts_per_hertz]") {
  // Braking at 9 Hz the 3 hp machine rings on a stiff voltage; how the torque swings half a second after a small step.
  const PublishedMachine m = krause_3hp();
  const auto swing = [&](double damping) {
    Loop loop = settled(m, 0.15, -0.9, with({{"damping", damping}}));
    loop.load_torque *= 1.05;
    loop.run_for(0.5);
    double low = 1e9, high = -1e9;
    for (int k = 0; k < 3000; ++k) {
      loop.step();
      low = std::min(low, loop.torque_now()), high = std::max(high, loop.torque_now());
    }
    return high - low;
  };
  const double without = swing(0.0), damped = swing(1.0);
  INFO("swing " << without << " N m without, " << damped << " with damping");
  CHECK(damped < 0.1 * without);  // ringing on against died out
}

TEST_CASE("volts per hertz: what it cannot do is refused", "[controllers][volts_per_hertz]") {
  ControllerSetup setup = setup_for(krause_3hp());
  setup.speed_control = false;
  CHECK_THROWS_WITH(VoltsPerHertz::prepare(setup, {}), Catch::Contains("follows a speed"));
  setup.speed_control = true;
  setup.delay_periods = 3;
  CHECK_THROWS_WITH(VoltsPerHertz::prepare(setup, {}), Catch::Contains("0, 1 or 2"));
  setup.delay_periods = 1;
  CHECK_THROWS_WITH(VoltsPerHertz::prepare(setup, with({{"current_limit_peak_A", 3.0}})),
                    Catch::Contains("magnetising current"));
}
