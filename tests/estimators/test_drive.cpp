// The estimators closing the loop of a drive without a speed sensor: matched parameters, current noise of 1 %
// of rated peak, torque steps, generating down to 0.5 Hz, reversal, and the known price of a wrong rotor
// resistance.
#include <catch2/catch.hpp>

#include "estimators/methods.hpp"
#include "tests/estimators/drive_bench.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

std::vector<Rider> all_riders(const EstimatorSetup& setup) {
  std::vector<Rider> riders;
  each_sensorless_method([&]<class Method>() { riders.push_back(rider<Method>(setup)); });
  return riders;
}
const int methods = [] {
  int count = 0;
  each_sensorless_method([&]<class Method>() { ++count; });
  return count;
}();

double slip_of(const PublishedMachine& machine, double torque) {  // electrical rad/s, at nominal flux
  const BelievedMachine<double> m = believe(setup_of(machine));
  return m.R_R * torque * m.per_nominal_flux * m.per_nominal_flux / m.torque_factor;
}

struct Point {
  std::string name;
  double speed, torque;  // mechanical rad/s, N m
};
// Motoring and generating at shares of rated speed, 0.7 of rated torque (less in proportion above rated
// speed), and generating with the stator at +-0.5 Hz.
Point at_speed(const PublishedMachine& machine, double share, double sense) {
  const double torque = 0.7 * machine.plate.torque_Nm / std::max(1.0, share);
  return {(sense > 0 ? "motoring " : "generating ") + std::to_string(share), share * machine.plate.speed_rad_s(),
          sense * torque};
}
Point at_half_hertz(const PublishedMachine& machine, double sense) {
  const double torque = 0.7 * machine.plate.torque_Nm;
  const double w_r = rad_per_turn * 0.5 + slip_of(machine, torque);
  return {"generating at 0.5 Hz", sense * w_r / machine.circuit.pole_pairs, -sense * torque};
}

// Ramp to speed without load, torque step at 1.8 s; 1 s of steady running from 1.5 s after the step.
void check_point(const PublishedMachine& machine, const Point& point, int loop) {
  DriveBench bench(machine, 7);
  bench.speed_from = loop;
  bench.speed_reference = [&](double t) { return point.speed * std::min(1.0, t / 0.8); };
  bench.load_torque = [&](double t) { return t < 1.8 ? 0.0 : point.torque; };
  std::vector<Rider> riders = all_riders(setup_of(machine));
  SpeedScore after_step{1.8, 2.3, machine.plate.speed_rad_s()}, steady{3.3, 4.3, machine.plate.speed_rad_s()};
  double least_trust = 1.0;
  bench.run(4.6, riders, [&](const Truth& truth, const std::vector<Estimate<double>>& estimates) {
    const Estimate<double>& e = estimates[std::size_t(loop)];
    after_step.see(truth, e);
    steady.see(truth, e);
    if (truth.time > 3.3) least_trust = std::min(least_trust, e.trust);
  });
  INFO(machine.name << ", " << riders[std::size_t(loop)].name << " in the loop, " << point.name << ": steady rms "
                    << 100 * steady.rms() << " %, most " << 100 * steady.most << " %, step " << 100 * after_step.rms()
                    << " %");
  // The project's own demands: 1 % of rated speed steady, 3 % rms for 0.5 s after a torque step.
  CHECK(steady.rms() < 0.01);
  CHECK(steady.most < 0.01);
  CHECK(after_step.rms() < 0.03);
  CHECK(std::fabs(steady.mean_frequency()) > 0.4);  // it did run where it was meant to
  CHECK(least_trust > 0.3);
}

}  // namespace

TEST_CASE("estimators: each holds a sensorless drive at the ends of its range", "[estimators][drive]") {
  for (const PublishedMachine& machine : {krause_3hp(), barut_3kW(), krishnan_5hp()}) {
    for (int loop = 0; loop < methods; ++loop) {
      check_point(machine, at_speed(machine, 0.05, 1.0), loop);
      check_point(machine, at_speed(machine, 1.5, 1.0), loop);
      check_point(machine, at_half_hertz(machine, 1.0), loop);
    }
  }
}

TEST_CASE("estimators: each holds a sensorless drive at every operating point", "[estimators][drive][long]") {
  for (const PublishedMachine& machine : published_machines()) {
    for (int loop = 0; loop < methods; ++loop) {
      for (const double share : {0.05, 0.2, 0.6, 1.0, 1.5}) check_point(machine, at_speed(machine, share, 1.0), loop);
      for (const double share : {0.2, 0.6, 1.0, 1.5}) check_point(machine, at_speed(machine, share, -1.0), loop);
      for (const double sense : {1.0, -1.0}) check_point(machine, at_half_hertz(machine, sense), loop);
    }
  }
}

// Bias of speed with rotor resistance believed wrong: slip frequency (1 - believed / true) / pole pairs. The
// flux is right all the same (R_R and alpha scale together, and the d-axis balance R_R i_d = alpha psi does
// not change), so the slip alone is wrong.
TEST_CASE("estimators: a wrong rotor resistance costs the slip's share and no more", "[estimators][drive]") {
  for (const PublishedMachine& machine : {barut_3kW(), krishnan_5hp()}) {
    for (const double believed : {0.5, 1.5}) {
      for (int loop = 0; loop < methods; ++loop) {
        EstimatorSetup setup = setup_of(machine);
        setup.circuit.rotor_resistance *= believed;
        std::vector<Rider> riders = all_riders(setup);
        DriveBench bench(machine, 3);
        bench.speed_from = loop;
        bench.believed_R_r = believed;
        bench.speed_reference = [&](double t) { return 0.6 * machine.plate.speed_rad_s() * std::min(1.0, t / 0.8); };
        bench.load_torque = [&](double t) { return t > 1.2 ? 0.7 * machine.plate.torque_Nm : 0.0; };
        SpeedScore score{2.5, 3.5, 1.0};
        double slip = 0.0;
        bench.run(3.8, riders, [&](const Truth& truth, const std::vector<Estimate<double>>& estimates) {
          score.see(truth, estimates[std::size_t(loop)]);
          if (truth.time >= score.from && truth.time < score.to) {
            slip += rad_per_turn * truth.electrical_frequency - machine.circuit.pole_pairs * truth.speed;
          }
        });
        const double price = slip / double(score.count) * (1.0 - believed) / machine.circuit.pole_pairs;
        INFO(machine.name << ", " << riders[std::size_t(loop)].name << ", believed " << believed);
        CHECK(score.bias() == Approx(price).epsilon(0.05));  // the project's own demand; 1 % or better is met
      }
    }
  }
}

TEST_CASE("estimators: a loaded drive reverses through zero speed without a sensor", "[estimators][drive]") {
  for (const PublishedMachine& machine : {barut_3kW(), hinkkanen_2kW()}) {
    for (int loop = 0; loop < methods; ++loop) {
      const double rated = machine.plate.speed_rad_s();
      DriveBench bench(machine, 3);
      bench.speed_from = loop;
      bench.speed_reference = [&](double t) {
        return 0.6 * rated * (t < 1 ? std::min(1.0, t / 0.5) : std::max(-1.0, 3.0 - 2.0 * t));
      };
      bench.load_torque = [&](double t) { return t > 0.7 ? 0.7 * machine.plate.torque_Nm : 0.0; };
      std::vector<Rider> riders = all_riders(setup_of(machine));
      SpeedScore way{0.9, 2.6, rated}, after{2.6, 3.4, rated};
      bench.run(3.7, riders, [&](const Truth& truth, const std::vector<Estimate<double>>& estimates) {
        way.see(truth, estimates[std::size_t(loop)]);
        after.see(truth, estimates[std::size_t(loop)]);
      });
      INFO(machine.name << ", " << riders[std::size_t(loop)].name);
      CHECK(way.most < 0.03);  // as after a torque step; stator frequency is below 0.5 Hz for some 20 ms only
      CHECK(after.rms() < 0.01);
    }
  }
}
