// State feedback of the current loop: nothing left on the matched plant, nothing left on the wrong one with integral action,
// the observer's drive equal to the one that is told its state, the schedule without a jump.
#include <catch2/catch.hpp>
#include <cmath>

#include "controllers/state_feedback_design.hpp"
#include "plant/linear/current_loop.hpp"
#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

constexpr double two_pi = 6.28318530717958647692;
using Loop = ClosedLoopOf<StateFeedback>;

Settings chosen(bool integral, bool observer) {
  Settings s;
  s.set("integral_action", integral ? 1.0 : 0.0);
  s.set("observer", observer ? 1.0 : 0.0);
  return s;
}

// Torque control at an imposed speed, flux up.
ControllerSetup torque_setup(const PublishedMachine& truth, int delay = 1) {
  ControllerSetup setup = setup_for(truth);
  setup.speed_control = false;
  setup.delay_periods = delay;
  setup.start_rotor_flux_Wb = setup.rotor_flux_reference_Wb;
  return setup;
}
Loop torque_drive(const PublishedMachine& truth, const ControllerSetup& setup, const Settings& given, double speed) {
  Loop loop(truth, setup, given);
  loop.speed_imposed = true;
  loop.speed = speed;
  return loop;
}

// Current that is missing in the steady state at 80 % of rated torque, share of the reference.
double error_left(Loop& loop, const PublishedMachine& truth) {
  loop.measured.torque_reference = 0.8 * truth.nameplate.torque_Nm;
  loop.run_for(1.0);
  return magnitude(loop.true_dq() - loop.command.current_reference) / magnitude(loop.command.current_reference);
}

}  // namespace

// The design's own plant, sampled exactly (its zero-order hold is exact): u = N r - K x + z settles where N says. Left is the
// rounding of gains of 400 V/Wb on fluxes of 1 Wb against 1 A: 1e-12, and what of the slowest mode remains after 5 s.
TEST_CASE("state feedback: no error stays on the matched linear plant", "[controllers][closed_form]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const int delay : {0, 1, 2}) {
      for (const double hertz : {0.0, 25.0, 60.0}) {
        for (const double integral : {0.0, two_pi * 60.0}) {
          const linear::CurrentLoopDesign design{truth.circuit, 1e-4, delay,
                                                 two_pi * 0.06 / (delay + 0.5) * 1e4 / two_pi, integral};
          const linear::System plant = linear::current_loop(design, two_pi * hertz);
          const linear::CurrentLoopGains gains = linear::current_loop_gains(design, two_pi * hertz);
          // (x, z, 1) a period ahead; sixteen squarings are 65536 periods.
          const auto n = plant.order();
          linear::Matrix ahead = linear::Matrix::Zero(n + 3, n + 3);
          linear::Vector r(2), start = linear::Vector::Zero(n + 3);
          r << 3.0, -5.0;
          start(n + 2) = 1.0;
          ahead.topLeftCorner(n, n) = plant.A - plant.B * gains.K;
          ahead.block(0, n, n, 2) = plant.B;
          ahead.block(0, n + 2, n, 1) = plant.B * gains.N * r;
          ahead.block(n, n, 2, 2).setIdentity();
          if (integral > 0.0) {
            ahead.block(n, 0, 2, 2) = -gains.K_integral;
            ahead.block(n, n + 2, 2, 1) = gains.K_integral * r;
          }
          ahead(n + 2, n + 2) = 1.0;
          for (int twice = 0; twice < 16; ++twice) ahead = (ahead * ahead).eval();
          const linear::Vector x = ahead * start;
          INFO(truth.name << ", delay " << delay << ", " << hertz << " Hz, integral " << integral << ": "
                          << x.head(2).transpose());
          CHECK((x.head(2) - r).norm() < 1e-9 * r.norm());
        }
      }
    }
  }
}

// The machine itself, inverter included, as believed, with slip. At a point of the schedule the orientation's model leaves up
// to 1e-4 (its frame; true_dq() is the true flux's). Between points K and N run straight, while the part of N that belongs to the
// voltages under way is the product of two straight lines, K_u and the voltage, both growing with speed: (half of rated frequency)^2 / 8 of
// the product of their slopes, 0.2 V over a gain of 40 V/A at two periods of delay and none without: 3e-3. Integral action
// leaves the orientation's part alone.
TEST_CASE("state feedback: no error stays on the matched drive", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const int delay : {0, 1, 2}) {
      for (const double points : {-1.0, 0.6}) {  // points of the schedule, half of rated frequency apart
        for (const bool observer : {false, true}) {
          INFO(truth.name << ", delay " << delay << ", " << points << " points, observer " << observer);
          const double speed = points * 0.5 * truth.nameplate.angular_frequency() / truth.circuit.pole_pairs;
          Loop plain = torque_drive(truth, torque_setup(truth, delay), chosen(false, observer), speed);
          const double without = error_left(plain, truth);
          Loop integrated = torque_drive(truth, torque_setup(truth, delay), chosen(true, observer), speed);
          const double with = error_left(integrated, truth);
          INFO("error left " << without << ", with integral action " << with);
          CHECK(without < (points == -1.0 || delay == 0 ? 1e-4 : 3e-3));
          CHECK(with < 1e-4);
          if (observer) CHECK(with < 1e-9);  // its frame is the machine's: settled integrals and rounding
        }
      }
    }
  }
}

// A stator resistance 20 % off is a voltage off by 0.2 R_s i: without integral action that over the loop's gain K_i + R is
// left of the current (closed form, K of the design), with it nothing.
TEST_CASE("state feedback: integral action takes away what a wrong resistance leaves", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    ControllerSetup setup = torque_setup(truth);
    setup.circuit.stator_resistance *= 1.2;
    const double speed = 0.5 * truth.nameplate.speed_rad_s();
    Loop plain = torque_drive(truth, setup, chosen(false, false), speed);
    const double without = error_left(plain, truth);
    const double gain =
        plain.constants.current.gains.first[0] /
        (1.0 + plain.constants.current.gains.first[4]);  // the delayed voltage divides it in the steady state
    const double expected = 0.2 * truth.circuit.stator_resistance / (gain + plain.constants.current.resistance);
    Loop integrated = torque_drive(truth, setup, chosen(true, false), speed);
    const double with = error_left(integrated, truth);
    INFO(truth.name << ": " << without << " (closed form " << expected << "), with integral action " << with);
    Loop observed = torque_drive(truth, setup, chosen(true, true), speed);
    (void)error_left(observed, truth);
    // The observer's frame is turned by the wrong resistance; the current's length is the reference's all the same.
    const double length = magnitude(observed.current()) / magnitude(observed.command.current_reference);
    INFO("length with observer " << length);
    CHECK(std::fabs(length - 1.0) < 1e-6);            // settled integrals
    CHECK(without == Approx(expected).epsilon(0.1));  // the turning frame's share of the impedance, left out
    CHECK(with < 1e-4);                               // as on the matched drive
  }
}

// Told the true flux and its angle with the measured current (direct orientation), or with an observer that begins right: the
// machine at a held speed is linear, the observer predicts it to 2e-12 a period (current_flux_observer.hpp), the test's
// Runge-Kutta steps to 3e-13.
TEST_CASE("state feedback: an observer that begins right changes nothing", "[controllers][published]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const int delay : {0, 1, 2}) {
      for (const double factor : {0.0, 3.0}) {
        ControllerSetup told = torque_setup(truth, delay);
        told.direct_orientation = true;
        Settings observing = chosen(true, true);
        observing.set("faster_than_controller", factor);
        const double speed = 0.6 * truth.nameplate.speed_rad_s();
        Loop direct = torque_drive(truth, told, chosen(true, false), speed);
        ControllerSetup observed = torque_setup(truth, delay);
        observed.start_speed_rad_s = speed;
        Loop by_observer = torque_drive(truth, observed, observing, speed);
        double worst = 0.0;
        for (int k = 0; k < 3000; ++k) {
          const double reference = (k < 200 ? 0.0 : k < 1500 ? 0.8 : -0.6) * truth.nameplate.torque_Nm;
          direct.measured.torque_reference = by_observer.measured.torque_reference = reference;
          direct.step();
          by_observer.step();
          worst = max(worst, magnitude(direct.current() - by_observer.current()));
        }
        INFO(truth.name << ", delay " << delay << ", factor " << factor << ": worst " << worst << " A");
        CHECK(worst < 1e-9 * truth.nameplate.peak_current_A());
      }
    }
  }
}

// The step against the lone inductance that the weights stand for: first order with the bandwidth asked for, late by d + 1 periods
// of which half are in the loop's own lag. Overshoot: what integral action adds must stay small (the reference gain is made so).
TEST_CASE("state feedback: the step is quick and does not overshoot", "[controllers][physics]") {
  for (const PublishedMachine& truth : published_machines()) {
    for (const bool integral : {false, true}) {
      Loop loop =
          torque_drive(truth, torque_setup(truth), chosen(integral, false), 0.4 * truth.nameplate.speed_rad_s());
      loop.run_for(0.3);
      const double before = loop.true_dq().y;
      loop.measured.torque_reference = 0.5 * truth.nameplate.torque_Nm;
      double peak = 0.0, rise = -1.0, target = 0.0;
      for (int k = 0; k < 200; ++k) {
        loop.step();
        target = loop.command.current_reference.y;
        peak = max(peak, (loop.true_dq().y - before) / (target - before));
        if (rise < 0.0 && peak > 0.9) rise = (k + 1) * 1e-4;
      }
      INFO(truth.name << ", integral " << integral << ": peak " << peak << ", 90 % after " << rise << " s");
      CHECK(peak < 1.05);
      CHECK(rise <
            2e-4 + std::log(10.0) / (two_pi * 382.0));  // 0.06 / 1.5 T: 382 Hz; two periods pass before anything moves
    }
  }
}

// Held for 50 ms at a voltage limit that lets no torque through, then released: an integral that had gone on would take
// limit / (K_I error a period) = hundreds of periods to come back.
TEST_CASE("state feedback: the integral does not wind up", "[controllers][physics]") {
  const PublishedMachine truth = hinkkanen_2kW2();
  Loop loop = torque_drive(truth, torque_setup(truth), chosen(true, false), 0.5 * truth.nameplate.speed_rad_s());
  loop.run_for(0.3);
  const double full = loop.dc_link;
  loop.measured.torque_reference = 0.8 * truth.nameplate.torque_Nm;
  loop.dc_link = 0.25 * full;
  double clipped = 0.0;
  for (int k = 0; k < 200; ++k) {
    loop.step();
    clipped += loop.command.clipped;
  }
  INFO("clipped " << clipped << " ticks");
  CHECK(clipped > 100.0);
  loop.dc_link = full;
  loop.run_for(0.02);  // five times 1 / w_I of the integral's 76 Hz, twice over
  const double missing = magnitude(loop.true_dq() - loop.command.current_reference);
  INFO("missing " << missing << " A");
  CHECK(missing < 0.02 * truth.nameplate.peak_current_A());
}

// Through zero speed and through every point of the table: an electrical speed moved by 1e-9 rad/s moves the voltage by its
// slope only, some 1 V s/rad: 1e-8 V.
TEST_CASE("state feedback: the schedule has no jump", "[controllers][closed_form]") {
  const PublishedMachine truth = barut_3kW();
  const auto c = StateFeedback::prepare(torque_setup(truth), chosen(true, false));
  std::vector<double> speeds{0.0};
  for (std::size_t n = 1; n + 1 < schedule_points; ++n) {
    for (const double side : {-1.0, 1.0}) speeds.push_back(side * c.current.gains.from[n]);
  }
  CHECK(speeds.size() == 11);
  for (const double w : speeds) {
    const auto voltage = [&](double at_speed) {
      StateCurrentState<double> s;
      s.given = {Vec2<double>{40.0, 150.0}, Vec2<double>{10.0, 100.0}};
      RotorFrame<double> f;
      f.angle = {0.0, 1.0};
      f.flux = f.divisor_flux = truth.rotor_flux_Wb;
      f.electrical_speed = at_speed;
      f.stator_frequency = at_speed + 10.0;
      f.current = {4.0, 7.0};
      const Vec2<double> flux{truth.rotor_flux_Wb, 0.05};
      const auto out = control_current(s, c.current, f, flux, f.current, Vec2<double>{4.2, 6.0}, 1e4, 2e4);
      return out.given;
    };
    INFO("at " << w << " rad/s");
    CHECK(magnitude(voltage(w + 1e-9) - voltage(w - 1e-9)) < 1e-7);
  }
}

TEST_CASE("state feedback: gains written down and given again are the same constants", "[controllers][gains]") {
  const ControllerSetup setup = torque_setup(krishnan_5hp());
  const Settings open = chosen(true, true);
  const auto designed = StateFeedback::prepare(setup, open);
  const auto given = StateFeedback::prepare(setup, with_gains(setup, open));
  const auto a = numbers_of<const double>(designed), b = numbers_of<const double>(given);
  REQUIRE(a.size() == b.size());
  for (std::size_t n = 0; n < a.size(); ++n) CHECK(*a[n] == *b[n]);
}

TEST_CASE("state feedback: gains that do not fit are refused with what is wanted", "[controllers][gains]") {
  const ControllerSetup setup = torque_setup(krishnan_5hp());
  const Settings whole = with_gains(setup, chosen(true, true));
  const auto refused = [&](const Settings& s, const char* says) {
    INFO(says);
    CHECK_THROWS_WITH(StateFeedback::prepare(setup, s), Catch::Contains(says));
  };
  const auto changed = [&](const char* name, auto change) {
    Settings s = whole;
    SettingTable table = *whole.table(name);
    change(table);
    s.set(name, table);
    return s;
  };
  Settings other = whole;
  other.set("gain_period_s", 2e-4);
  refused(other, "another control period");
  other = whole;
  other.set("integral_action", 0.0);
  refused(other, "integral_action is false");
  refused(changed("gain_frequency_Hz", [](SettingTable& t) { t.numbers[2] = t.numbers[1]; }), "rise from 0");
  refused(changed("K", [](SettingTable& t) { t.numbers[1] = 1.0; }), "across d and q must be 0 at zero speed");
  refused(changed("K", [](SettingTable& t) { --t.count; }), "one for each of the 7 speeds");
  refused(changed("reference_gain",
                  [](SettingTable& t) {
                    t = {7, 1, 2, std::vector<double>(14, 0.0)};
                  }),
          "wanted is 2 x 2");
  refused(changed("L", [](SettingTable& t) { t.numbers[9] += 1.0; }), "(a, -b), (b, a)");
  ControllerSetup later = setup;
  later.delay_periods = 2;
  CHECK_THROWS_WITH(StateFeedback::prepare(later, whole), Catch::Contains("2 x 8"));
  Settings alone;
  alone.set("K", *whole.table("K"));
  refused(alone, "gain_frequency_Hz is missing");
  alone.set("gain_frequency_Hz", *whole.table("gain_frequency_Hz"));
  refused(alone, "reference_gain is missing");
  Settings without_K;
  without_K.set("reference_gain", *whole.table("reference_gain"));
  refused(without_K, "K is missing");
}
