// Where a scenario's drive is linearised, and the linear system there.
//
//   mains      the stable slip that carries the load (and friction) at t = 0, at an imposed speed that speed's slip
//   inverter   the first reference's speed (or torque) and the load at t = 0, rotor flux as the controller steadily has it (flux_rule.hpp)
//   a machine alone: rated voltage, frequency and speed, the speed held
//
// The frame turns with the supply, its d axis on the rotor flux. The plant is machine and shaft; load and friction add their slope at
// that speed. An inverter's dead time and a controller are no part of it.
#pragma once

#include "plant/linear/machine_system.hpp"
#include "sim/engine/plant_row.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct OperatingPoint {
  SteadyState steady;            // rotor flux on the real axis; `voltage` is the machine's own
  linear::MachinePoint machine;  // the same, with inertia and damping as the shaft has them at this speed
  bool speed_held = false;       // imposed by a load, or no shaft given: speed is no state
  bool speed_measured = false;   // by a sensor
  double load_torque_Nm = 0.0;   // load and friction at this speed
  PlantRow row{};                // as the trace's columns, at t = 0 (plant_columns() names them)
};

// Throws InputError where there is no such point: beyond pull-out, no speed that takes the first torque reference, no rated values.
OperatingPoint operating_point(const Scenario& scenario);
OperatingPoint operating_point(const MachineSettings& machine);

// A machine alone as a scenario: on its rated mains, its speed held at the rated one; for maps of a machine file.
Scenario machine_on_mains(const MachineSettings& machine);

// States i_d, i_q, psi_d, psi_q and, unless it is held, the speed; inputs u_d, u_q and with the speed the load torque; outputs i_d, i_q and
// the speed where it is a state and measured. Units of machine_system.hpp.
linear::System system_at(const OperatingPoint& point);

}  // namespace slipbench
