// The machine's numbers against each other: what no machine has, and what a slip of units makes of one that exists.
#include <functional>

#include "plant/steady_state.hpp"
#include "sim/scenario/check.hpp"

namespace slipbench {
namespace {

using Refuse = std::function<void(const char* name, const std::string& message)>;

void check_leakage(const MachineSettings& m, const Refuse& refuse) {
  const Circuit<double> c = m.circuit();
  const char* name = m.circuit_form == "t" ? "stator_leakage_H" : "total_leakage_H";
  if (!(c.stator_leakage + c.rotor_leakage > 0.0)) {
    refuse(name,
           "stator and rotor leakage are both 0; one must be above it, or the machine has no transient inductance "
           "(L_s L_r = L_m^2)");
  }
  const double L_m = c.magnetizing_inductance;
  if (!(c.stator_inductance() * c.rotor_inductance() - L_m * L_m > 1e-6 * L_m * L_m)) {
    refuse(name,
           "the leakage is under a millionth of the magnetizing inductance: no real machine, and no digits left to "
           "compute with");
  }
  const bool rotor = c.rotor_leakage > c.stator_leakage;
  const double greater = rotor ? c.rotor_leakage : c.stator_leakage;
  if (greater > L_m) {
    refuse(m.circuit_form == "t" && rotor ? "rotor_leakage_H" : name,
           "a leakage of " + short_text(greater) + " H is more than the magnetizing inductance, " + short_text(L_m) +
               " H: no such machine; inductances are in H, not mH");
  }
}

// Plates round and round off; a factor of ten or a thousand is a unit, a factor of two the pole pairs.
void check_plate(const MachineSettings& m, const Refuse& refuse) {
  const Nameplate plate = m.nameplate();
  const double synchronous_rpm = 60.0 * m.rated_frequency_Hz / static_cast<double>(m.pole_pairs);
  if (!(m.rated_speed_rpm < synchronous_rpm)) {
    refuse("rated_speed_rpm", "is " + number_text(m.rated_speed_rpm) + " rpm; it must be below synchronous speed, " +
                                  short_text(synchronous_rpm) + " rpm with " + std::to_string(m.pole_pairs) +
                                  " pole pairs at " + number_text(m.rated_frequency_Hz) + " Hz");
  }
  if (m.rated_speed_rpm < 0.5 * synchronous_rpm) {
    refuse("rated_speed_rpm", "is " + number_text(m.rated_speed_rpm) + " rpm, less than half of synchronous speed, " +
                                  short_text(synchronous_rpm) + " rpm with " + std::to_string(m.pole_pairs) +
                                  " pole pairs at " + number_text(m.rated_frequency_Hz) + " Hz: no rated speed");
  }
  const double apparent = 1.7320508075688772 * m.rated_line_voltage_V * m.rated_current_A;
  if (m.rated_power_W > 1.05 * apparent) {  // 5 % for what plates round
    refuse("rated_power_W", "is " + number_text(m.rated_power_W) + " W; rated voltage and current give only " +
                                short_text(apparent) + " VA");
  }
  if (m.rated_power_W < 0.1 * apparent) {  // power factor times efficiency is above 0.3 in the smallest machines
    refuse("rated_power_W", "is " + number_text(m.rated_power_W) + " W, under a tenth of the " + short_text(apparent) +
                                " VA of rated voltage and current; power is in W, not kW, current in A");
  }
  const double torque = m.rated_power_W / plate.speed_rad_s();
  if (plate.torque_Nm > 2.0 * torque || plate.torque_Nm < 0.5 * torque) {
    refuse("rated_torque_Nm",
           "is " + number_text(plate.torque_Nm) + " N m; rated power at rated speed is " + short_text(torque) + " N m");
  }
}

}  // namespace

void check_machine(const MachineSettings& m, const Node& root, const std::string& table) {
  const auto key = [&](const char* name) { return table == "machine" ? "machine." + std::string(name) : table; };
  check_leakage(m, [&](const char* name, const std::string& message) { refuse_at(root, key(name), message); });
  check_plate(m, [&](const char* name, const std::string& message) {
    refuse_at(root, key(name), "'" + key(name) + "' " + message);
  });
}

}  // namespace slipbench
