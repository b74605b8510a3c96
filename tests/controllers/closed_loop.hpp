// A small drive for the controller's tests: machine and shaft by RK4 in sub-steps, averaged inverter, the command
// computed at k standing over [k+d, k+d+1). Measurements are exact.
#pragma once

#include <array>

#include "controllers/methods.hpp"
#include "plant/inverter_averaged.hpp"
#include "plant/machine.hpp"
#include "tests/published/circuits.hpp"

namespace slipbench::test {

struct PublishedMachine {
  const char* name;
  Circuit<double> circuit;
  Nameplate nameplate;
  double inertia_kgm2;
  double rotor_flux_Wb;  // of the circuit at rated voltage, frequency and speed, rounded
};

inline PublishedMachine machine(const char* name, const published::PublishedCircuit& c, const Nameplate& plate,
                                double rotor_flux_Wb) {
  return {name, c.circuit, plate, c.inertia, rotor_flux_Wb};
}
// Ratings as printed; current of the 3 hp machine from its circuit, torque and speed of the 5 hp one at a slip of 3 %, ours.
inline PublishedMachine krause_3hp() {
  return machine("Krause 3 hp", published::krause_3hp_circuit(), {2238, 220, 8.84, 60, 1710, 11.9}, 0.45);
}
inline PublishedMachine barut_3kW() {
  return machine("Barut 3 kW", published::barut_3kw_circuit(), {3000, 380, 6.9, 50, 1430, 20}, 0.89);
}
inline PublishedMachine hinkkanen_2kW2() {
  return machine("Hinkkanen 2.2 kW", published::hinkkanen_2kw_circuit(), {2200, 400, 5.0, 50, 1430, 14.6}, 0.92);
}
inline PublishedMachine krishnan_5hp() {
  return machine("Krishnan 5 hp", published::krishnan_5hp_circuit(), {3730, 200, 13.0, 60, 1746, 20}, 0.41);
}
inline std::array<PublishedMachine, 4> published_machines() {
  return {krause_3hp(), barut_3kW(), hinkkanen_2kW2(), krishnan_5hp()};
}

// DC link 15 % above the peak of the rated line voltage, 10 kHz, no dead time.
inline ControllerSetup setup_for(const PublishedMachine& m) {
  ControllerSetup s;
  s.circuit = m.circuit;
  s.nameplate = m.nameplate;
  s.inertia_kgm2 = m.inertia_kgm2;
  s.inverter = {.dc_link_V = 1.15 * 1.41421356237309504880 * m.nameplate.line_voltage_V,
                .switching_frequency_Hz = 10e3,
                .zero_current_width_A = 0.02 * m.nameplate.peak_current_A()};
  s.rotor_flux_reference_Wb = m.rotor_flux_Wb;
  return s;
}

template <class Method>
class ClosedLoopOf {
 public:
  // The true machine and inverter; the controller believes what `setup` says.
  Machine<double> machine;
  LegError<double> leg;
  double inertia, dc_link, load_torque = 0.0;
  bool speed_imposed = false;
  MachineFlux<double> psi;
  double speed = 0.0;

  ControllerSetup setup;
  typename Method::template Constants<double> constants;
  typename Method::template State<double> state;
  Measurement<double> measured;
  Command<double> command;
  std::int64_t tick = 0;

  ClosedLoopOf(const PublishedMachine& truth, const ControllerSetup& believed, const Settings& given = {})
      : machine(make_machine(truth.circuit)),
        leg(leg_error(0.0, 0.0, 0.0, 1.0)),
        inertia(truth.inertia_kgm2),
        dc_link(believed.inverter.dc_link_V),
        setup(believed),
        constants(Method::prepare(believed, given)),
        state(Method::begin(believed, constants)) {
    if (setup.start_rotor_flux_Wb > 0.0) magnetise();
    pending_.fill({0.5, 0.5, 0.5});
  }

  [[nodiscard]] Vec2<double> current() const { return stator_current(machine, psi); }
  [[nodiscard]] double torque_now() const { return slipbench::torque(machine, psi, current()); }
  [[nodiscard]] double rotor_flux() const { return magnitude(psi.rotor); }
  // Stator current seen from the true rotor flux.
  [[nodiscard]] Vec2<double> true_dq() const { return (1.0 / rotor_flux()) * seen_from(psi.rotor, current()); }
  // The rotor-flux-oriented controller's angle less the true one, rad, at the last control tick.
  [[nodiscard]] double angle_error() const { return angle_error_; }
  // Means over the last period, stationary frame and seen from the true rotor flux.
  [[nodiscard]] Vec2<double> mean_voltage() const { return mean_voltage_; }
  [[nodiscard]] Vec2<double> mean_voltage_dq() const { return mean_voltage_dq_; }
  [[nodiscard]] Vec2<double> mean_current_dq() const { return mean_current_dq_; }
  [[nodiscard]] double time() const { return static_cast<double>(tick) * setup.control_period_s; }

  // One control period. `direct` feeds the true flux back where the setup asks for direct orientation.
  void step() {
    measured.current = current();
    measured.dc_link = dc_link;
    measured.speed = speed;
    measured.rotor_flux = rotor_flux();
    measured.rotor_flux_angle = slipbench::atan2(psi.rotor.y, psi.rotor.x);
    command = Method::step(state, measured, constants);
    if constexpr (std::is_same_v<Method, RotorFluxOriented>) {
      const Vec2<double> model = state.orientation.rotor_flux;
      angle_error_ = slipbench::atan2(cross(psi.rotor, model), dot(psi.rotor, model));
    }
    for (std::size_t i = pending_.size() - 1; i > 0; --i) pending_[i] = pending_[i - 1];
    pending_[0] = command.duty;
    apply(pending_[static_cast<std::size_t>(setup.delay_periods)]);
    ++tick;
  }
  void run_for(double seconds) {
    const auto periods = static_cast<std::int64_t>(seconds / setup.control_period_s + 0.5);
    for (std::int64_t i = 0; i < periods; ++i) step();
  }

 private:
  static constexpr int substeps = 4;       // 25 us against poles up to 330 1/s: RK4's error a step is (0.008)^5 / 120
  std::array<Phases<double>, 3> pending_;  // this tick's command and those before
  double angle_error_ = 0.0;
  Vec2<double> mean_voltage_, mean_voltage_dq_, mean_current_dq_;

  struct Rate {
    MachineFlux<double> psi;
    double speed;
  };
  [[nodiscard]] Vec2<double> voltage(const MachineFlux<double>& at, const Phases<double>& duty) const {
    return averaged_voltage(leg, phases_of(stator_current(machine, at)), duty, dc_link);
  }
  [[nodiscard]] Rate rate(const MachineFlux<double>& at, double w, const Phases<double>& duty) const {
    const Vec2<double> i = stator_current(machine, at);
    const double dw = speed_imposed ? 0.0 : (slipbench::torque(machine, at, i) - load_torque) / inertia;
    return {flux_derivative(machine, at, i, voltage(at, duty), machine.pole_pairs * w), dw};
  }
  static MachineFlux<double> moved(const MachineFlux<double>& a, double h, const MachineFlux<double>& b) {
    return {a.stator + h * b.stator, a.rotor + h * b.rotor};
  }
  void apply(const Phases<double>& duty) {
    const double h = setup.control_period_s / substeps;
    mean_voltage_ = mean_voltage_dq_ = mean_current_dq_ = {0.0, 0.0};
    note_means(duty, 0.5 / substeps);
    for (int i = 0; i < substeps; ++i) {
      const Rate a = rate(psi, speed, duty);
      const Rate b = rate(moved(psi, 0.5 * h, a.psi), speed + 0.5 * h * a.speed, duty);
      const Rate c = rate(moved(psi, 0.5 * h, b.psi), speed + 0.5 * h * b.speed, duty);
      const Rate d = rate(moved(psi, h, c.psi), speed + h * c.speed, duty);
      psi = moved(moved(moved(moved(psi, h / 6.0, a.psi), h / 3.0, b.psi), h / 3.0, c.psi), h / 6.0, d.psi);
      speed += h / 6.0 * (a.speed + 2.0 * b.speed + 2.0 * c.speed + d.speed);
      note_means(duty, i + 1 < substeps ? 1.0 / substeps : 0.5 / substeps);
    }
  }
  void note_means(const Phases<double>& duty, double weight) {  // trapezoidal rule over the sub-steps
    const Vec2<double> u = voltage(psi, duty), direction = (1.0 / max(rotor_flux(), 1e-12)) * psi.rotor;
    mean_voltage_ = mean_voltage_ + weight * u;
    mean_voltage_dq_ = mean_voltage_dq_ + weight * seen_from(direction, u);
    mean_current_dq_ = mean_current_dq_ + weight * seen_from(direction, current());
  }
  void magnetise() {
    const double flux = setup.start_rotor_flux_Wb, L_m = setup.circuit.magnetizing_inductance;
    psi.rotor = {flux, 0.0};
    psi.stator = {setup.circuit.stator_inductance() * flux / L_m, 0.0};
  }
};

using ClosedLoop = ClosedLoopOf<RotorFluxOriented>;

}  // namespace slipbench::test
