#include "sim/engine/columns.hpp"

#include "sim/engine/observer.hpp"

namespace slipbench {

const std::vector<Column>& plant_columns() {
  static const std::vector<Column> columns = {
      {"time_s", "s", "time since the start of the run"},
      {"speed_rpm", "rpm", "mechanical speed"},
      {"speed_reference_rpm", "rpm", "speed reference, nan under torque control or without a controller"},
      {"torque_Nm", "N m", "electromagnetic torque"},
      {"load_torque_Nm", "N m", "load torque, friction not included"},
      {"stator_frequency_Hz", "Hz", "signed frequency of the rotor flux"},
      {"u_alpha_V", "V", "stator voltage, mean over the switching period"},
      {"u_beta_V", "V", "stator voltage, mean over the switching period"},
      {"i_alpha_A", "A", "stator current"},
      {"i_beta_A", "A", "stator current"},
      {"i_d_A", "A", "stator current along the true rotor flux"},
      {"i_q_A", "A", "stator current across the true rotor flux"},
      {"i_a_A", "A", "phase current"},
      {"i_b_A", "A", "phase current"},
      {"i_c_A", "A", "phase current"},
      {"rotor_flux_Wb", "Wb", "rotor flux linkage, peak"},
      {"rotor_flux_angle_rad", "rad", "angle of the rotor flux in the stationary frame"},
      {"rotor_flux_reference_Wb", "Wb", "rotor flux reference, nan without a controller"},
      {"dc_link_V", "V", "DC link voltage, nan on mains"},
      {"stator_resistance_ohm", "ohm", "true stator resistance"},
      {"rotor_resistance_ohm", "ohm", "true rotor resistance"}};
  return columns;
}

std::vector<Column> estimator_columns(const std::string& name) {
  return {{name + ".speed_rpm", "rpm", "estimated mechanical speed"},
          {name + ".rotor_flux_Wb", "Wb", "estimated rotor flux linkage, peak"},
          {name + ".rotor_flux_angle_rad", "rad", "estimated angle of the rotor flux"},
          {name + ".torque_Nm", "N m", "estimated electromagnetic torque"},
          {name + ".trust", "", "what the estimator thinks of itself, 0 to 1"}};
}

std::vector<Column> RunInfo::columns() const {
  std::vector<Column> all = plant;
  all.insert(all.end(), measured.begin(), measured.end());
  for (const std::string& name : estimator_names) {
    const std::vector<Column> five = estimator_columns(name);
    all.insert(all.end(), five.begin(), five.end());
  }
  return all;
}

}  // namespace slipbench
