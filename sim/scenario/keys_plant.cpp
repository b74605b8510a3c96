// Rows of what is simulated: run, machine, shaft, loads, supply, process noise, drift. Units stand in the names; ranges
// are what physics and sense allow, wide enough for any honest drive.
#include "sim/scenario/key_rows.hpp"

namespace slipbench {
namespace {

// `format` is read and checked, and kept nowhere.
Slot format_slot() {
  return Slot(+[](Scenario&, std::size_t) -> std::int64_t& {
    static thread_local std::int64_t version = 1;
    return version;
  });
}

void run_keys(std::vector<Key>& keys) {
  Rows top(keys, "");
  top.number("format", format_slot(), "", {1, 1}, "version of this format");
  top.word("title", AT(title), "what the run is called");
  top.number("seed", AT(seed), "", {0}, "every noise sample derives from it");
  Rows k(keys, "run");
  k.number("duration_s", AT(run.duration_s), "s", positive(any_time), "whole multiple of the trace period")
      .must()
      .fixed();
  k.number("plant_step_s", AT(run.plant_step_s), "s", positive(1.0), "fixed step of the integration").must().fixed();
  k.number("control_period_s", AT(run.control_period_s), "s", positive(1.0),
           "period of controller and estimators, a whole multiple of the plant step")
      .must()
      .fixed();
  k.number("trace_period_s", AT(run.trace_period_s), "s", positive(any_time),
           "time between rows of the trace, a whole multiple of the plant step")
      .must()
      .fixed();
  k.word("method", AT(run.method), "integration method, of order 1, 2, 4, 5")
      .words({"euler", "midpoint", "rk4", "cash_karp5"});
  k.word("start", AT(run.start), "at t = 0: nothing, rotor flux up, or the equilibrium of first reference and load")
      .words({"standstill", "magnetised", "steady"});
  k.number("initial_speed_rpm", AT(run.initial_speed_rpm), "rpm", within(any_speed), "shaft speed at t = 0");
}

void machine_keys(std::vector<Key>& keys) {
  Rows k(keys, "machine");
  const Range resistance = positive(any_resistance), leakage = up_to(any_inductance);
  k.word("file", AT(machine.file), "machine file, relative to this file; keys given here override its");
  k.word("circuit", AT(machine.circuit_form), "form of the equivalent circuit given")
      .words({"t", "inverse_gamma", "gamma"});
  k.number("pole_pairs", AT(machine.pole_pairs), "", {1, 100}, "pole pairs").must();
  k.number("stator_resistance_ohm", AT(machine.stator_resistance_ohm), "ohm", resistance, "a phase of the star").must();
  k.number("rotor_resistance_ohm", AT(machine.rotor_resistance_ohm), "ohm", resistance,
           "a phase, referred to the stator, of the circuit form given")
      .must();
  k.number("stator_leakage_H", AT(machine.stator_leakage_H), "H", leakage, "stator leakage").must().with({"t"});
  k.number("rotor_leakage_H", AT(machine.rotor_leakage_H), "H", leakage, "rotor leakage, referred").must().with({"t"});
  k.number("total_leakage_H", AT(machine.total_leakage_H), "H", positive(any_inductance), "the one leakage there is")
      .must()
      .with({"inverse_gamma", "gamma"});
  k.number("magnetizing_inductance_H", AT(machine.magnetizing_inductance_H), "H", positive(any_inductance),
           "of the circuit form given")
      .must();
  k.number("rated_power_W", AT(machine.rated_power_W), "W", positive(1e9), "at the shaft").must();
  k.number("rated_line_voltage_V", AT(machine.rated_line_voltage_V), "V", positive(any_voltage), "rms, line to line")
      .must();
  k.number("rated_current_A", AT(machine.rated_current_A), "A", positive(any_current), "rms, in the line").must();
  k.number("rated_frequency_Hz", AT(machine.rated_frequency_Hz), "Hz", positive(any_frequency), "of the stator").must();
  k.number("rated_speed_rpm", AT(machine.rated_speed_rpm), "rpm", positive(any_speed), "below synchronous speed")
      .must();
  k.number("rated_torque_Nm", AT(machine.rated_torque_Nm), "N m", positive(any_torque), "at the shaft")
      .otherwise("rated power over rated speed");
  k.number("rated_power_factor", AT(machine.rated_power_factor), "", positive(1.0), "cosine of voltage against current")
      .otherwise("not given");
  k.number("rated_efficiency", AT(machine.rated_efficiency), "", positive(1.0), "shaft over electrical power")
      .otherwise("not given");
  k.number("resistance_temperature_degC", AT(machine.resistance_temperature_degC), "degC", {-60.0, 400.0},
           "winding temperature the resistances belong to");
  k.word("connection", AT(machine.connection), "of the winding; circuit values are those of the star all the same")
      .words({"star", "delta"});
}

void load_keys(std::vector<Key>& keys) {
  Rows shaft(keys, "shaft");
  shaft.number("inertia_kgm2", AT(shaft.inertia_kgm2), "kg m2", positive(1e6), "all of it, referred to the motor")
      .must();
  shaft.number("viscous_friction_Nms", AT(shaft.viscous_friction_Nms), "N m s", up_to(1e5), "torque per rad/s");
  shaft.number("coulomb_friction_Nm", AT(shaft.coulomb_friction_Nm), "N m", up_to(any_torque), "against motion");
  shaft.number("friction_width_rpm", AT(shaft.friction_width_rpm), "rpm", positive(1e4),
               "speed over which opposing torques turn their sign");
  Rows k(keys, "load[]");
  const Range opposing = up_to(any_torque);
  k.word("kind", AT(loads[i].kind), "what the load does")
      .must()
      .words({"profile", "constant_torque", "fan", "imposed_speed"});
  k.number("torque_Nm", AT(loads[i].torque_profile), "N m", within(any_torque), "torque over time, sign kept")
      .must()
      .with({"profile"})
      .live();
  k.number("torque_Nm", AT(loads[i].torque_Nm), "N m", opposing, "against motion, none at rest")
      .must()
      .with({"constant_torque"})
      .live();
  k.number("rated_torque_Nm", AT(loads[i].rated_torque_Nm), "N m", opposing, "torque at the fan's rated speed")
      .must()
      .with({"fan"})
      .live();
  k.number("rated_speed_rpm", AT(loads[i].rated_speed_rpm), "rpm", positive(any_speed), "the fan's rated speed")
      .must()
      .with({"fan"});
  k.number("speed_rpm", AT(loads[i].speed_rpm), "rpm", within(any_speed), "speed held by a dynamometer, over time")
      .must()
      .with({"imposed_speed"})
      .live();
  Rows drift(keys, "drift[]");
  drift.word("quantity", AT(drifts[i].quantity), "what changes")
      .must()
      .words({"stator_resistance", "rotor_resistance", "magnetizing_inductance", "stator_leakage", "rotor_leakage",
              "inertia", "dc_link"});
  drift.number("factor", AT(drifts[i].factor), "", positive(any_factor), "times the value at t = 0, over time").must();
}

void supply_keys(std::vector<Key>& keys) {
  Rows k(keys, "supply");
  k.word("kind", AT(supply.kind), "what feeds the stator").must().words({"mains", "inverter"});
  k.number("line_voltage_V", AT(supply.line_voltage_V), "V", positive(any_voltage), "rms, line to line")
      .must()
      .with({"mains"})
      .live();
  k.number("frequency_Hz", AT(supply.frequency_Hz), "Hz", positive(any_frequency), "of the mains")
      .must()
      .with({"mains"})
      .live();
  k.number("phase_deg", AT(supply.phase_deg), "deg", within(360.0), "of phase a's cosine at t = 0").with({"mains"});
  k.number("dc_link_V", AT(supply.dc_link_V), "V", positive(any_voltage), "DC-link voltage")
      .must()
      .with({"inverter"})
      .live();
  k.number("switching_frequency_Hz", AT(supply.switching_frequency_Hz), "Hz", positive(1e7),
           "half or a whole multiple of the control frequency")
      .with({"inverter"})
      .otherwise("the control frequency");
  k.number("dead_time_s", AT(supply.dead_time_s), "s", up_to(1e-3), "between a leg's switches").with({"inverter"});
  k.number("device_drop_V", AT(supply.device_drop_V), "V", up_to(1e3), "mean forward drop").with({"inverter"});
  k.number("zero_current_width_A", AT(supply.zero_current_width_A), "A", positive(any_current),
           "current over which a leg's error turns its sign")
      .with({"inverter"})
      .otherwise("2 % of the rated peak current");
  k.word("model", AT(supply.model), "mean over a switching period; single edges are not offered yet")
      .with({"inverter"})
      .words({"averaged", "switched"});
  k.word("modulation", AT(supply.modulation), "common-mode choice")
      .with({"inverter"})
      .words({"space_vector", "sine", "discontinuous"});
  Rows noise(keys, "process_noise");
  const std::string_view added = "rms added each control period, alpha and beta each";
  noise.number("load_torque_Nm", AT(process_noise.load_torque_Nm), "N m", up_to(any_torque),
               "rms of a random walk over 1 s");
  noise.number("current_A", AT(process_noise.current_A), "A", up_to(any_current), added);
  noise.number("flux_Wb", AT(process_noise.flux_Wb), "Wb", up_to(1e4), added);
}

}  // namespace

void plant_keys(std::vector<Key>& keys) {
  run_keys(keys);
  machine_keys(keys);
  load_keys(keys);
  supply_keys(keys);
}

}  // namespace slipbench
