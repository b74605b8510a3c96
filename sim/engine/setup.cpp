// A scenario's constants, choices and first state as a RunSetup.
#include "sim/engine/setup.hpp"

#include <cmath>
#include <stdexcept>

#include "sim/engine/columns.hpp"
#include "sim/engine/plant.hpp"
#include "sim/engine/ports.hpp"
#include "sim/engine/sensors.hpp"
#include "sim/engine/setup_parts.hpp"
#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

std::int64_t whole(double quotient) { return std::llround(quotient); }

std::int64_t closing_estimator(const Scenario& s, const std::string& name) {
  for (std::size_t i = 0; i < s.estimators.size(); ++i) {
    if (s.estimators[i].name == name) return static_cast<std::int64_t>(i);
  }
  return -1;
}

void prepare_control(RunSetup& run, const Scenario& s) {
  ControlShape& shape = run.shape.control;
  shape.present = !s.on_mains();
  shape.speed_control = !s.reference.speed_rpm.empty();
  shape.from_standstill = s.run.start == "standstill";
  shape.delay_periods = s.controller.delay_periods;
  shape.speed_from = closing_estimator(s, s.controller.speed_from);
  shape.flux_from = closing_estimator(s, s.controller.flux_from);
  run.speed_reference = Profile(s.reference.speed_rpm, rad_s_in_rpm);
  run.torque_reference = Profile(s.reference.torque_Nm, 1.0);
  const double dead_time = s.supply.dead_time_s * s.belief.dead_time,
               drop = s.supply.device_drop_V * s.belief.device_drop;
  shape.compensated = shape.present && s.controller.dead_time_compensation && (dead_time > 0.0 || drop > 0.0);
  if (shape.present)
    run.believed_leg = leg_error(dead_time, s.supply.switching_frequency_Hz, drop, s.supply.zero_current_width_A);
}

void prepare_methods(RunSetup& run, const Scenario& s, EstimatorSetup e) {
  for (const auto& estimator : s.estimators) {
    try {
      prepare_estimator(run, estimator.kind, e, estimator.settings, estimator.precision == "float");
    } catch (const std::invalid_argument& unfit) {
      const std::string what = "estimator '" + estimator.name + "' cannot be set up: " + unfit.what();
      throw InputError(s.path, "estimator." + std::to_string(run.estimators.size()), what, "estimator");
    }
  }
  if (!run.shape.control.present) return;
  ControllerSetup c =
      controller_setup(s, modulation_of(s), run.shape.control.compensated, run.shape.control.speed_from >= 0);
  c.current_noise_A = e.current_noise_A;
  c.start_rotor_flux_Wb = e.start_rotor_flux_Wb;
  c.start_speed_rad_s = e.start_speed_rad_s;
  try {
    prepare_controller(run, s.controller.kind, c, s.controller.settings, s.controller.precision == "float");
  } catch (const std::invalid_argument& unfit) {
    throw InputError(s.path, "controller", std::string("the controller cannot be set up: ") + unfit.what(),
                     "controller");
  }
}

// Where plant, duties and sensors stand at the first tick.
void place_at_start(RunSetup& run, const Scenario& s) {
  const RunSetup* alone = &run;
  Plant<double> plant({&alone, 1});
  plant.set_state({}, s.run.initial_speed_rpm * rad_s_in_rpm);
  EstimatorSetup e = estimator_setup(s, current_noise(s));
  Phases<double> duty{0.5, 0.5, 0.5};
  if (const StartState start = start_state(s, plant, run.shape.first_tick); start.excited) {
    plant.set_state(start.flux, start.speed);
    e.start_rotor_flux_Wb = magnitude(start.flux.rotor);
    e.start_speed_rad_s = plant.speed();
    if (run.shape.control.present) duty = modulate(modulation_of(s), start.voltage, plant.dc_link());
  }
  prepare_methods(run, s, e);
  plant.apply(duty);
  run.state.drive = plant.state();
  run.state.duty = duty;
  run.state.pending.fill(duty);
  Sensors<double> sensors({&alone, 1});
  sensors.begin(plant, run.shape.first_tick * run.shape.steps_per_control);
  sensors.read(plant, run.shape.first_tick - 1);
  sensors.save(run.state.sensors, 0);
}

}  // namespace

RunInfo run_info(const Scenario& s) {
  RunInfo info{
      s.title, s.run.trace_period_s, s.run.control_period_s, s.run.duration_s, plant_columns(), measured_columns(s), {},
      {}};
  for (const auto& e : s.estimators) {
    info.estimator_names.push_back(e.name);
    info.estimator_kinds.push_back(e.kind);
  }
  return info;
}

RunSetup prepare_run(const Scenario& s, std::uint32_t noise_run, std::int64_t first_tick) {
  RunSetup run;
  RunShape& shape = run.shape;
  shape.first_tick = first_tick;
  shape.steps_per_control = whole(s.run.control_period_s / s.run.plant_step_s);
  shape.steps_per_trace = whole(s.run.trace_period_s / s.run.plant_step_s);
  shape.steps = whole(s.run.duration_s / s.run.trace_period_s) * shape.steps_per_trace;
  shape.control_period_s = s.run.control_period_s;
  run.seed = s.seed;
  run.noise_run = noise_run;
  run.info = run_info(s);
  prepare_plant(run, s);
  prepare_sensors(run, s);
  prepare_control(run, s);
  place_at_start(run, s);
  return run;
}

}  // namespace slipbench
