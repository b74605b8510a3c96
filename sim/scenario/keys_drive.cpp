// Rows of what watches and steers: sensors, reference, controller, estimators, belief, score.
#include "sim/scenario/key_rows.hpp"

namespace slipbench {
namespace {

// The rows of a converter channel; its three slots of three numbers are one number a piece for the DC link.
void channel_keys(std::vector<Key>& keys, const char* table, const std::string& letter, std::string_view unit,
                  double most, Slot noise, Slot offset, Slot gain_error, Slot bandwidth, Slot bits, Slot range) {
  Rows k(keys, table);
  k.number(("noise_" + letter).c_str(), noise, unit, up_to(most), "rms, each channel").live();
  k.number(("offset_" + letter).c_str(), offset, unit, within(most), "of each channel").live();
  k.number("gain_error", gain_error, "", {-0.9, 0.9}, "fraction, of each channel").live();
  k.number("bandwidth_Hz", bandwidth, "Hz", up_to(1e7), "first-order low pass before sampling; 0: none");
  k.number("bits", bits, "", {0, 24}, "of the converter; 0: no quantisation");
  k.number(("range_" + letter).c_str(), range, unit, up_to(2.0 * most), "end of range, either side of 0; 0: none");
}

void sensor_keys(std::vector<Key>& keys) {
  Rows current(keys, "sensors.current");
  current.number("phases", AT(sensors.current_phases), "", {2, 3}, "current sensors: 3, or 2 in phases a and b");
  channel_keys(keys, "sensors.current", "A", "A", any_current, AT(sensors.current.noise), AT(sensors.current.offset),
               AT(sensors.current.gain_error), AT(sensors.current.bandwidth_Hz), AT(sensors.current.bits),
               AT(sensors.current.range));
  channel_keys(keys, "sensors.voltage", "V", "V", any_voltage, AT(sensors.voltage.noise), AT(sensors.voltage.offset),
               AT(sensors.voltage.gain_error), AT(sensors.voltage.bandwidth_Hz), AT(sensors.voltage.bits),
               AT(sensors.voltage.range));
  channel_keys(keys, "sensors.dc_link", "V", "V", any_voltage, AT(sensors.dc_link.noise), AT(sensors.dc_link.offset[0]),
               AT(sensors.dc_link.gain_error[0]), AT(sensors.dc_link.bandwidth_Hz), AT(sensors.dc_link.bits),
               AT(sensors.dc_link.range));
  Rows k(keys, "sensors.speed");
  k.word("kind", AT(sensors.speed.kind), "speed sensor").must().words({"none", "ideal", "tachogenerator", "encoder"});
  k.number("noise_rpm", AT(sensors.speed.noise_rpm), "rpm", up_to(any_speed), "rms").with({"tachogenerator"});
  k.number("bandwidth_Hz", AT(sensors.speed.bandwidth_Hz), "Hz", up_to(1e7), "first-order low pass; 0: none")
      .with({"tachogenerator"});
  k.number("lines_per_rev", AT(sensors.speed.lines_per_rev), "", {1, 1000000}, "lines a turn, four edges a line")
      .with({"encoder"});
  k.number("clock_Hz", AT(sensors.speed.clock_Hz), "Hz", {1e3, 1e10}, "clock that times the edges").with({"encoder"});
  k.number("window_s", AT(sensors.speed.window_s), "s", positive(10.0), "evaluation window")
      .with({"encoder"})
      .otherwise("the whole multiple of the control period nearest 1 ms")
      .fixed();
  k.number("timeout_s", AT(sensors.speed.timeout_s), "s", positive(100.0), "no edge for this long reads as standstill")
      .with({"encoder"});
}

void control_keys(std::vector<Key>& keys) {
  Rows reference(keys, "reference");
  reference.number("speed_rpm", AT(reference.speed_rpm), "rpm", within(any_speed), "speed wanted, over time").live();
  reference.number("torque_Nm", AT(reference.torque_Nm), "N m", within(any_torque), "torque wanted, instead of a speed")
      .live();
  reference
      .number("rotor_flux_Wb", AT(reference.rotor_flux_Wb), "Wb", positive(1e4),
              "peak linkage, the upper limit that field weakening lowers")
      .otherwise("the circuit's at rated voltage, frequency and speed")
      .live();
  Rows k(keys, "controller");
  k.word("kind", AT(controller.kind), "control method").must().words(controller_kinds());
  k.word("orientation", AT(controller.orientation), "flux angle from slip and speed, or from an estimator")
      .with(speed_taking_controllers())
      .words({"indirect", "direct"});
  k.word("flux_from", AT(controller.flux_from), "estimator that gives the flux (direct orientation)")
      .with(speed_taking_controllers());
  k.word("speed_from", AT(controller.speed_from), "\"measured\", or an estimator's name: sensorless")
      .with(speed_taking_controllers());
  k.number("delay_periods", AT(controller.delay_periods), "", {0, 2}, "control periods from sample to voltage");
  k.word("dead_time_compensation", AT(controller.dead_time_compensation), "add the believed inverter error");
  k.word("precision", AT(controller.precision), "numbers of its step; float: as a single-precision board computes")
      .words({"double", "float"});
  k.word("file", AT(controller.file), "gain file; keys given here override the file's").with({"state_feedback"});
  Rows estimator(keys, "estimator[]");
  estimator.word("name", AT(estimators[i].name), "letters, digits, _; unique").must();
  estimator.word("kind", AT(estimators[i].kind), "estimation method").must().words(estimator_kinds());
  estimator.word("file", AT(estimators[i].file), "gain file; keys given here override the file's")
      .with({"linear_observer"});
  estimator
      .word("precision", AT(estimators[i].precision),
            "numbers of its step; float: as a single-precision board computes")
      .words({"double", "float"});
}

void belief_and_score_keys(std::vector<Key>& keys) {
  Rows belief(keys, "belief");
  const Range factor = positive(any_factor);
  const std::string_view meaning = "believed over true value at t = 0";
  belief.number("stator_resistance", AT(belief.stator_resistance), "", factor, meaning);
  belief.number("rotor_resistance", AT(belief.rotor_resistance), "", factor, meaning);
  belief.number("magnetizing_inductance", AT(belief.magnetizing_inductance), "", factor, meaning);
  belief.number("stator_leakage", AT(belief.stator_leakage), "", factor, meaning);
  belief.number("rotor_leakage", AT(belief.rotor_leakage), "", factor, meaning);
  belief.number("inertia", AT(belief.inertia), "", factor, meaning);
  belief.number("dead_time", AT(belief.dead_time), "", up_to(any_factor), meaning);
  belief.number("device_drop", AT(belief.device_drop), "", up_to(any_factor), meaning);
  belief.number("dc_link", AT(belief.dc_link), "", factor, meaning);
  belief.word("file", AT(belief.file), "machine file that is believed instead of the true machine");
  Rows score(keys, "score");
  score.number("from_s", AT(score.from_s), "s", up_to(any_time), "start of the window the figures are taken over");
  score.number("to_s", AT(score.to_s), "s", positive(any_time), "end of that window").otherwise("the end of the run");
  score.number("lost_error", AT(score.lost_error), "", positive(10.0), "speed error, of rated speed: lost past it");
  score.number("lost_for_s", AT(score.lost_for_s), "s", up_to(any_time), "if it lasts this long");
  score.number("settled_error", AT(score.settled_error), "", positive(10.0), "speed error, of rated speed: settled");
}

void event_keys(std::vector<Key>& keys) {
  Rows k(keys, "event[]");
  k.number("at_s", AT(events[i].at_s), "s", up_to(any_time), "acts at the first control tick at or after it").must();
  k.word("kind", AT(events[i].kind), "what happens")
      .must()
      .words({"speed_sensor_fault", "current_sensor_fault", "speed_from"});
  k.word("fault", AT(events[i].fault), "signal gone, reading held where it is, or all well again")
      .must()
      .with({"speed_sensor_fault", "current_sensor_fault"})
      .words({"no_signal", "stuck", "repaired"});
  k.word("phase", AT(events[i].phase), "whose sensor").must().with({"current_sensor_fault"}).words({"a", "b", "c"});
  k.word("estimator", AT(events[i].estimator), "\"measured\", or the estimator the controller takes its speed from")
      .must()
      .with({"speed_from"});
}

}  // namespace

void drive_keys(std::vector<Key>& keys) {
  sensor_keys(keys);
  control_keys(keys);
  event_keys(keys);
  belief_and_score_keys(keys);
}

}  // namespace slipbench
