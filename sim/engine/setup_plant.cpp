#include "sim/engine/plant_row.hpp"
#include "sim/engine/setup_parts.hpp"
#include "sim/engine/steppers.hpp"

namespace slipbench {

namespace {

// A healthy drive stays far inside these multiples of its ratings; beyond them the run has diverged.
constexpr double flux_ceiling = 100.0, speed_ceiling = 100.0;

Drifting drifting(std::string_view quantity) {
  if (quantity == "stator_resistance") return Drifting::stator_resistance;
  if (quantity == "rotor_resistance") return Drifting::rotor_resistance;
  if (quantity == "magnetizing_inductance") return Drifting::magnetizing_inductance;
  if (quantity == "stator_leakage") return Drifting::stator_leakage;
  if (quantity == "rotor_leakage") return Drifting::rotor_leakage;
  if (quantity == "inertia") return Drifting::inertia;
  if (quantity == "dc_link") return Drifting::dc_link;
  return Drifting::nothing;
}

void prepare_loads(RunSetup& run, const Scenario& s) {
  Drive<double>& drive = run.plant.drive;
  for (const auto& load : s.loads) {
    if (load.kind == "profile") run.loads.emplace_back(load.torque_profile, 1.0);
    if (load.kind == "constant_torque") drive.load.opposing += load.torque_Nm;
    if (load.kind == "fan") drive.load.fan += load.rated_torque_Nm / square(load.rated_speed_rpm * rad_s_in_rpm);
    if (load.kind == "imposed_speed") {
      run.shape.plant.speed_imposed = true;
      run.imposed_speed = Profile(load.speed_rpm, rad_s_in_rpm);
    }
  }
  run.shape.plant.profiles = run.loads.size();
}

}  // namespace

void prepare_plant(RunSetup& run, const Scenario& s) {
  PlantShape& shape = run.shape.plant;
  PlantNumbers<double>& c = run.plant;
  const Nameplate plate = s.machine.nameplate();
  shape.supply = s.on_mains() ? Supply::mains : Supply::inverter;
  shape.method = stepper_named(s.run.method).value();
  shape.step_s = s.run.plant_step_s;
  c.circuit = s.machine.circuit();
  c.inertia = s.shaft.inertia_kgm2;
  c.dc_link = s.supply.dc_link_V;
  c.flux_limit = flux_ceiling * plate.phase_peak_V() / plate.angular_frequency();
  c.speed_limit = speed_ceiling * plate.speed_rad_s();
  c.per_speed = 1.0 / plate.speed_rad_s();
  c.per_flux = plate.angular_frequency() / plate.phase_peak_V();
  c.rated_torque = plate.torque_Nm;
  c.drive.machine = make_machine(c.circuit);
  const double width = s.shaft.friction_width_rpm * rad_s_in_rpm;
  c.drive.shaft = {1.0 / c.inertia, s.shaft.viscous_friction_Nms, s.shaft.coulomb_friction_Nm, 1.0 / width};
  prepare_loads(run, s);
  if (s.on_mains()) {
    c.drive.mains = make_mains(s.supply.line_voltage_V, s.supply.frequency_Hz, s.supply.phase_deg);
  } else {
    shape.inverter_ideal = s.supply.dead_time_s == 0.0 && s.supply.device_drop_V == 0.0;
    c.drive.leg = leg_error(s.supply.dead_time_s, s.supply.switching_frequency_Hz, s.supply.device_drop_V,
                            s.supply.zero_current_width_A);
  }
  shape.opposed = c.drive.load.opposing != 0.0 || c.drive.shaft.coulomb != 0.0;
  for (const auto& d : s.drifts) {
    shape.drifts.push_back(drifting(d.quantity));
    run.drifts.emplace_back(d.factor, 1.0, 1.0);
  }
  c.walk_per_tick = s.process_noise.load_torque_Nm * sqrt(s.run.control_period_s);
  c.current_noise = s.process_noise.current_A;
  c.flux_noise = s.process_noise.flux_Wb;
}

}  // namespace slipbench
