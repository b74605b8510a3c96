#include <limits>

#include "sim/engine/setup_parts.hpp"

namespace slipbench {

namespace {

SpeedSensorKind speed_kind(const std::string& word) {
  if (word == "ideal") return SpeedSensorKind::ideal;
  if (word == "tachogenerator") return SpeedSensorKind::tachogenerator;
  if (word == "encoder") return SpeedSensorKind::encoder;
  return SpeedSensorKind::none;
}

AnalogChannel channel_of(const AnalogSensorSettings& s, std::size_t phase) {
  return {s.noise, s.bandwidth_Hz, s.gain_error[phase], s.offset[phase], s.bits, s.range};
}

}  // namespace

void prepare_sensors(RunSetup& run, const Scenario& s) {
  SensorShape& shape = run.shape.sensors;
  SensorNumbers<double>& c = run.sensors;
  const double h = s.run.plant_step_s;
  shape.two_currents = s.sensors.current_phases == 2;
  shape.has_voltage = s.sensors.voltage.present && s.on_mains();
  shape.has_dc_link = s.sensors.dc_link.present && !s.on_mains();
  shape.has_speed = s.sensors.speed.kind != "none";
  shape.current_filtered = s.sensors.current.bandwidth_Hz > 0.0;
  shape.voltage_filtered = s.sensors.voltage.bandwidth_Hz > 0.0;
  shape.dc_link_filtered = s.sensors.dc_link.bandwidth_Hz > 0.0;
  for (std::size_t phase = 0; phase < 3; ++phase) {
    c.current[phase] = prepare_analog_sensor(channel_of(s.sensors.current, phase), h);
    c.voltage[phase] = prepare_analog_sensor(channel_of(s.sensors.voltage, phase), h);
  }
  c.dc_link = prepare_analog_sensor(channel_of(s.sensors.dc_link, 0), h);
  c.believed_dc_link = s.on_mains() ? std::numeric_limits<double>::quiet_NaN() : s.supply.dc_link_V * s.belief.dc_link;
  const SpeedSensorSettings& v = s.sensors.speed;
  const SpeedSensorData data{
      speed_kind(v.kind), v.noise_rpm, v.bandwidth_Hz, {v.lines_per_rev, v.clock_Hz, v.timeout_s}, v.window_s};
  shape.speed = speed_sensor_timing(data, run.shape.steps_per_control, s.run.control_period_s);
  c.speed = prepare_speed_sensor(data, h);
}

double current_noise(const Scenario& s) { return total_noise_rms(channel_of(s.sensors.current, 0)); }

std::vector<Column> measured_columns(const Scenario& s) {
  std::vector<Column> all = {{"measured.i_a_A", "A", "measured phase current"},
                             {"measured.i_b_A", "A", "measured phase current"}};
  if (s.sensors.current_phases != 2) all.push_back({"measured.i_c_A", "A", "measured phase current"});
  if (s.sensors.voltage.present && s.on_mains()) {
    for (const char* name : {"measured.u_a_V", "measured.u_b_V", "measured.u_c_V"}) {
      all.push_back({name, "V", "measured phase voltage"});
    }
  }
  if (!s.on_mains())
    all.push_back({"measured.dc_link_V", "V", "measured DC link voltage, the believed one without that sensor"});
  if (s.sensors.speed.kind != "none") all.push_back({"measured.speed_rpm", "rpm", "measured speed"});
  return all;
}

}  // namespace slipbench
