// Time, shaft and inverter: numbers against each other.
#include "sim/scenario/check.hpp"

#include <cmath>

#include "plant/steady_state.hpp"
#include "sim/scenario/check_wiring.hpp"
#include "sim/scenario/fill.hpp"

namespace slipbench {
namespace {

constexpr double rad_s_per_rpm = 3.14159265358979323846 / 30.0;

void check_time(const Scenario& s, const Node& root) {
  const RunSettings& run = s.run;
  const auto multiple = [&](double a, const char* key, double b, const char* of) {
    if (is_whole_multiple(a, b)) return;
    refuse_at(root, key,
              std::string("'") + key + "' is " + number_text(a) + " s; it must be a whole multiple of " + of + ", " +
                  number_text(b) + " s: time is counted in whole ticks");
  };
  multiple(run.control_period_s, "run.control_period_s", run.plant_step_s, "run.plant_step_s");
  multiple(run.trace_period_s, "run.trace_period_s", run.plant_step_s, "run.plant_step_s");
  multiple(run.duration_s, "run.duration_s", run.trace_period_s, "run.trace_period_s");
  if (run.duration_s / run.plant_step_s > 1e15) {
    refuse_at(root, "run.duration_s",
              "'run.duration_s' is " + number_text(run.duration_s) + " s: more than 1e15 plant steps");
  }
  if (!(s.score.from_s < s.score.to_s && s.score.to_s <= run.duration_s * (1.0 + 1e-9))) {
    const bool late = s.score.to_s > run.duration_s;
    refuse_at(root, late ? "score.to_s" : "score.from_s",
              "the score window, " + number_text(s.score.from_s) + " s to " + number_text(s.score.to_s) +
                  " s, must be a part of the run, 0 to " + number_text(run.duration_s) + " s");
  }
  if (s.sensors.speed.kind == "encoder") {
    multiple(s.sensors.speed.window_s, "sensors.speed.window_s", run.control_period_s, "run.control_period_s");
    if (s.sensors.speed.timeout_s < s.sensors.speed.window_s) {
      refuse_at(root, "sensors.speed.timeout_s",
                "'sensors.speed.timeout_s' is shorter than sensors.speed.window_s, " +
                    number_text(s.sensors.speed.window_s) + " s");
    }
  }
}

// A bound in four digits, rounded to the safe side where it must be: upwards for side = 1, so that what is shown passes.
std::string bound_text(double bound, double side) {
  const std::string text = short_text(bound);
  return side * (std::stod(text) - bound) < -1e-12 * bound ? short_text((1.0 + 5e-4 * side) * bound) : text;
}

// Explicit steps follow a decay exp(-r t) well only while r h stays below 1.
void check_steps(const Scenario& s, const Node& root) {
  const double h = s.run.plant_step_s;
  const Circuit<double> c = s.machine.circuit();
  const double g = c.magnetizing_inductance / c.rotor_inductance();
  const double leakage = c.stator_inductance() - g * c.magnetizing_inductance;  // sigma L_s
  const double rate = (c.stator_resistance + g * g * c.rotor_resistance) / leakage;
  if (h * rate > 1.0) {
    refuse_at(root, "run.plant_step_s",
              "'run.plant_step_s' is " + number_text(h) + " s; the stator current decays at " + short_text(rate) +
                  " 1/s, so the step must be at most " + bound_text(1.0 / rate, -1.0) + " s");
  }
  if (s.supply.kind == "inverter") {
    const SupplySettings& u = s.supply;
    const double error = u.dc_link_V * u.dead_time_s * u.switching_frequency_Hz + u.device_drop_V;
    const double least = error * h / leakage;
    if (u.zero_current_width_A < least) {
      refuse_at(root, "supply.zero_current_width_A",
                "'supply.zero_current_width_A' is " + number_text(u.zero_current_width_A) + " A; dead time and drop, " +
                    short_text(error) +
                    " V a leg, turn their sign within it, and the plant step can follow that from " +
                    bound_text(least, 1.0) + " A upwards");
    }
  }
  double opposing = s.shaft.coulomb_friction_Nm;
  for (const LoadSettings& load : s.loads) {
    if (load.kind == "imposed_speed") return;  // the shaft equation is off
    if (load.kind == "constant_torque") opposing += load.torque_Nm;
  }
  const double J = s.shaft.inertia_kgm2;
  const double least_rpm = opposing * h / J / rad_s_per_rpm;
  if (s.shaft.friction_width_rpm < least_rpm) {
    refuse_at(root, "shaft.friction_width_rpm",
              "'shaft.friction_width_rpm' is " + number_text(s.shaft.friction_width_rpm) +
                  " rpm; opposing torques of " + short_text(opposing) +
                  " N m turn their sign within it, and the plant step can follow that from " +
                  bound_text(least_rpm, 1.0) + " rpm upwards");
  }
  if (h * s.shaft.viscous_friction_Nms > J) {
    refuse_at(root, "shaft.viscous_friction_Nms",
              "'shaft.viscous_friction_Nms' is " + number_text(s.shaft.viscous_friction_Nms) +
                  " N m s; with this inertia the plant step can follow at most " + bound_text(J / h, -1.0) + " N m s");
  }
}

void check_inverter(const Scenario& s, const Node& root) {
  const SupplySettings& u = s.supply;
  if (u.model != "averaged") {
    refuse_at(root, "supply.model", "'supply.model' is \"switched\", which is not offered yet; \"averaged\" is",
              "unavailable");
  }
  const double ratio = u.switching_frequency_Hz * s.run.control_period_s;
  if (!is_whole_multiple(ratio, 1.0) && std::fabs(ratio - 0.5) > 0.5e-9) {
    refuse_at(root, "supply.switching_frequency_Hz",
              "'supply.switching_frequency_Hz' is " + short_text(ratio) + " times the control frequency, " +
                  short_text(1.0 / s.run.control_period_s) + " Hz; it must be 1/2 or a whole number of times");
  }
  if (2.0 * u.dead_time_s * u.switching_frequency_Hz >= 1.0) {
    refuse_at(root, "supply.dead_time_s",
              "'supply.dead_time_s' is " + number_text(u.dead_time_s) +
                  " s; two dead times leave nothing of a switching period of " +
                  short_text(1.0 / u.switching_frequency_Hz) + " s");
  }
}

}  // namespace

void refuse_at(const Node& root, const std::string& dotted, const std::string& message, const std::string& code) {
  const Node* node = nullptr;
  std::string key = dotted;
  while ((node = find(root, key)) == nullptr) {
    const std::size_t dot = key.rfind('.');
    key = dot == std::string::npos ? "" : key.substr(0, dot);
  }
  Place place = key == dotted ? node->place : node->name_place;
  if (key.empty()) place = {root.place.file, 1, 1};
  refuse(place, dotted, message, code);
}

bool is_whole_multiple(double a, double b) {
  const double ratio = a / b, whole = std::floor(ratio + 0.5);
  return whole >= 1.0 && std::fabs(ratio - whole) <= 1e-9 * ratio;
}

void derive_defaults(Scenario& s, const Node& root) {
  const Nameplate plate = s.machine.nameplate();
  s.machine.rated_torque_Nm = plate.torque_Nm;
  if (s.score.to_s == 0.0) s.score.to_s = s.run.duration_s;
  if (s.reference.rotor_flux_Wb == 0.0) s.reference.rotor_flux_Wb = rated_rotor_flux(s.machine.circuit(), plate);
  if (s.supply.switching_frequency_Hz == 0.0) s.supply.switching_frequency_Hz = 1.0 / s.run.control_period_s;
  if (s.supply.zero_current_width_A == 0.0) s.supply.zero_current_width_A = 0.02 * plate.peak_current_A();
  if (find(root, "sensors.speed.window_s") == nullptr) {
    const double periods = std::floor(1e-3 / s.run.control_period_s + 0.5);
    s.sensors.speed.window_s = s.run.control_period_s * (periods < 1.0 ? 1.0 : periods);
  }
}

void check_relations(const Scenario& s, const Node& root) {
  check_machine(s.machine, root, "machine");
  check_wiring(s, root);
  check_time(s, root);
  if (s.supply.kind == "inverter") check_inverter(s, root);
  check_steps(s, root);
}

}  // namespace slipbench
