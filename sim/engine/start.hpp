// How a run begins: what estimators and controller are told beforehand, and the state the drive starts from.
//
//   standstill   no flux, no current, run.initial_speed_rpm
//   magnetised   rotor flux at its reference along the alpha axis, d current up, no torque
//   steady       the equilibrium of the true circuit at the first reference and load; a run-in then settles delays, filters,
//                controller and estimators; on mains the stable slip
#pragma once

#include <array>

#include "controllers/control.hpp"
#include "estimators/method.hpp"
#include "sim/engine/plant.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

EstimatorSetup estimator_setup(const Scenario& scenario, double current_noise_A);
Modulation modulation_of(const Scenario& scenario);
ControllerSetup controller_setup(const Scenario& scenario, Modulation modulation, bool compensate_dead_time,
                                 bool sensorless);

struct StartState {
  bool excited = false;  // flux is up; false: at standstill as the plant was made
  MachineFlux<double> flux;
  double speed = 0.0;    // mechanical, rad/s
  Vec2<double> voltage;  // that holds it
};

// The state at control tick `first_tick` (0, or earlier for a run-in; on mains the phase follows). May move `plant`'s speed to
// find the load there. Throws InputError where there is no equilibrium.
StartState start_state(const Scenario& scenario, Plant<double>& plant, std::int64_t first_tick);

// Run-in lengths tried for a steady start, and how still (share of the rated values) the drive must stand after each.
// Only a limit cycle (dead time, encoder lines) keeps a drive from the first; its means must still stand.
struct RunIn {
  double seconds, allowed;
  [[nodiscard]] std::int64_t first_tick(const Scenario& s) const {
    return -static_cast<std::int64_t>(seconds / s.run.control_period_s);
  }
};
inline constexpr std::array<RunIn, 3> run_ins{{{1.0, 1e-7}, {4.0, 1e-6}, {16.0, 5e-4}}};

// What is thrown after the last of them.
InputError never_steady(const Scenario& scenario);

}  // namespace slipbench
