// The linear observer: begun right it stays right, begun wrong it comes right at the pace of its gain, and given gains are used.
#include <catch2/catch.hpp>

#include "estimators/linear_observer.hpp"
#include "plant/linear/current_loop.hpp"
#include "tests/estimators/drive_bench.hpp"

using namespace slipbench;
using namespace slipbench::tests;

// A drive that magnetises, speeds up (a = 750 rad/s2 electrical) and takes load, without noise. The speed moves within a period, its mean
// alone is used: that puts the predicted current off by a T^3 w psi / (12 L_sigma) = 3e-6 A each period, of which the flux takes
// some 0.01 H, over the 100 to 1000 periods that its error lives: 1e-5 of the flux.
TEST_CASE("linear observer: begun right it stays right while the speed moves", "[estimators][physics]") {
  for (const PublishedMachine& machine : published_machines()) {
    std::vector<Rider> riders{rider<LinearObserver>(setup_of(machine))};
    DriveBench bench(machine, 4);
    bench.noise_share = 0.0;
    bench.speed_reference = [&](double t) { return machine.plate.speed_rad_s() * std::min(1.0, 2.0 * t); };
    bench.load_torque = [&](double t) { return t > 0.7 ? 0.5 * machine.plate.torque_Nm : 0.0; };
    double worst_flux = 0.0, worst_torque = 0.0;
    bench.run(2.0, riders, [&](const Truth& truth, const std::vector<Estimate<double>>& estimates) {
      const double angle = estimates[0].rotor_flux_angle, size = estimates[0].rotor_flux;
      const Vec2<double> flux{size * std::cos(angle), size * std::sin(angle)};
      worst_flux = std::max(worst_flux, magnitude(flux - truth.rotor_flux));
      worst_torque = std::max(worst_torque, std::fabs(estimates[0].torque - truth.torque));
    });
    INFO(machine.name << ": flux off by " << worst_flux << " Wb, torque by " << worst_torque << " N m");
    CHECK(worst_flux < 1e-5 * bench.flux_reference());
    CHECK(worst_torque < 1e-5 * machine.plate.torque_Nm);
  }
}

// At a held speed the error is e(k) = (I - M C) e^(A T) e(k-1): its slow pole, a third of the rotor's time constant here, decides.
TEST_CASE("linear observer: a wrong flux dies away at the pace of the gain", "[estimators][closed_form]") {
  const PublishedMachine machine = barut_3kW();
  const EstimatorSetup setup = setup_of(machine);
  Settings given;
  SettingTable speeds{1, 1, 1, {0.0}}, L;
  const linear::Matrix M = linear::faster_observer(setup.circuit, 1e-4, 0.0, 2400.0, 3.0);
  L = {1, 4, 2, {}};
  for (Eigen::Index row = 0; row < 4; ++row) {
    for (Eigen::Index column = 0; column < 2; ++column) L.numbers.push_back(M(row, column));
  }
  given.set("gain_frequency_Hz", speeds);
  given.set("L", L);
  const auto c = LinearObserver::prepare(setup, given);
  auto state = LinearObserver::begin(setup, c);
  state.observer.x.flux = {0.5, 0.0};  // of a dead machine
  Estimate<double> e;
  for (int k = 0; k <= 500; ++k) e = LinearObserver::step(state, Sample<double>{}, c);
  const double rate = setup.circuit.rotor_resistance / setup.circuit.rotor_inductance();
  // The first period's share of the fast pole is gone; its trace in the slow one is the ratio of the poles, a percent.
  CHECK(e.rotor_flux == Approx(0.5 * std::exp(-3.0 * rate * 0.05)).epsilon(0.02));
}
