// Families of cases for packs: shipped scenarios, shortened, each lane with numbers, knots and noise of its own.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "sim/scenario/read.hpp"

namespace slipbench::pack_tests {

struct Family {
  std::string name;
  std::function<Scenario(std::size_t)> scenario;  // of case i
  std::function<std::uint32_t(std::size_t)> noise_run;
};

inline std::string number(double x) { return std::to_string(x); }
inline std::uint32_t same_run(std::size_t) { return 0; }
inline std::uint32_t own_run(std::size_t i) { return static_cast<std::uint32_t>(i); }

inline Scenario shipped(const std::string& name, std::vector<Override> overrides) {
  static const std::string folder = SLIPBENCH_SOURCE_DIR "/configs/scenarios/";
  return read_scenario(folder + name + ".toml", overrides);
}

// The conveyor with its knots within 60 ms.
inline Scenario conveyor(std::vector<Override> more) {
  std::vector<Override> all = {{"run.duration_s", "0.06"},
                               {"run.start", "magnetised"},
                               {"score.from_s", "0.0"},
                               {"load.1.torque_Nm", "[[0.0, 0.0], [0.03, 0.0], [0.03, 14.0]]"},
                               {"reference.speed_rpm", "[[0.0, 0.0], [0.004, 0.0], [0.03, 300.0], [0.05, 75.0]]"},
                               {"drift.0.factor", "[[0.0, 1.0], [0.02, 1.0], [0.04, 1.5]]"},
                               {"drift.1.factor", "[[0.0, 1.0], [0.02, 1.0], [0.04, 1.2]]"}};
  all.insert(all.end(), more.begin(), more.end());
  return shipped("conveyor_hot_rotor", all);
}

// Light cases settle in the first run-in, the encoder's limit cycle asks for a longer one.
inline Family steady_family() {
  return {"steady start",
          [](std::size_t i) {
            const double x = static_cast<double>(i);
            Scenario s = conveyor({{"run.start", "steady"},
                                   {"run.duration_s", "0.02"},
                                   {"run.plant_step_s", "50e-6"},
                                   {"run.trace_period_s", "0.5e-3"},
                                   {"load.1.torque_Nm", "[[0.0, " + number(1.0 + x) + "]]"},
                                   {"reference.speed_rpm", "[[0.0, " + number(300.0 + 40.0 * x) + "]]"}});
            s.sensors.speed = {};
            s.sensors.speed.kind = "ideal";
            return s;
          },
          own_run};
}

inline std::vector<Family> families() {
  const auto of = [](std::size_t i) { return static_cast<double>(i); };
  std::vector<Family> all;
  all.push_back({"mains start",
                 [=](std::size_t i) {
                   return shipped("mains_start", {{"run.duration_s", "0.1"},
                                                  {"supply.frequency_Hz", number(60.0 - of(i))},
                                                  {"supply.phase_deg", number(7.0 * of(i))},
                                                  {"sensors.voltage.bandwidth_Hz", number(3e3 + 100.0 * of(i))},
                                                  {"sensors.voltage.noise_V", number(i % 3 == 1 ? 0.0 : 0.5)}});
                 },
                 same_run});
  all.push_back({"wrong beliefs, own noise",
                 [=](std::size_t i) {
                   return conveyor({{"belief.rotor_resistance", number(0.7 + 0.1 * of(i))},
                                    {"belief.dead_time", number(0.5 + 0.05 * of(i))},
                                    {"sensors.current.offset_A", "[" + number(0.02 * of(i)) + ", 0.0, -0.01]"},
                                    {"sensors.current.bits", i % 4 == 2 ? "0" : "12"},
                                    {"sensors.current.bandwidth_Hz", number(4e3 + 200.0 * of(i))},
                                    {"sensors.dc_link.noise_V", number(i % 2 == 0 ? 0.5 : 0.0)},
                                    {"sensors.speed.lines_per_rev", std::to_string(1000 + 24 * i)}});
                 },
                 own_run});
  all.push_back(
      {"own knots of load, reference and drift",
       [=](std::size_t i) {
         const std::string at = number(0.01 + 0.003 * of(i));
         return conveyor(
             {{"load.1.torque_Nm", "[[0.0, 0.0], [" + at + ", 0.0], [" + at + ", " + number(10 + of(i)) + "]]"},
              {"reference.speed_rpm", "[[" + at + ", 0.0], [0.05, " + number(100.0 + 30.0 * of(i)) + "]]"},
              {"drift.0.factor", "[[0.0, 1.0], [" + at + ", " + number(1.0 + 0.1 * of(i)) + "]]"}});
       },
       same_run});
  for (const char* quantity : {"dc_link", "inertia", "magnetizing_inductance", "stator_leakage", "rotor_leakage"}) {
    all.push_back({std::string("drift of ") + quantity,
                   [=](std::size_t i) {
                     const std::string to = number(0.95 - 0.01 * of(i));
                     return conveyor(
                         {{"drift.2.quantity", quantity},
                          {"drift.2.factor", "[[0.01, 1.0], [0.02, " + to + "], [0.03, " + to + "], [0.03, 1.02]]"},
                          {"shaft.coulomb_friction_Nm", number(0.5 + 0.1 * of(i))}});
                   },
                   same_run});
  }
  all.push_back({"two current sensors, tachogenerator",
                 [=](std::size_t i) {
                   Scenario s = shipped("hoist_lowering",
                                        {{"run.duration_s", "0.06"},
                                         {"score.from_s", "0.0"},
                                         {"sensors.current.gain_error", "[0.01, " + number(0.002 * of(i)) + ", 0.0]"},
                                         {"machine.rotor_resistance_ohm", number(1.4 + 0.05 * of(i))}});
                   s.sensors.speed = {};
                   s.sensors.speed.kind = "tachogenerator";
                   s.sensors.speed.bandwidth_Hz = 200.0 + 10.0 * of(i);
                   s.sensors.speed.noise_rpm = of(i);
                   return s;
                 },
                 own_run});
  all.push_back({"controller and estimators in float",
                 [=](std::size_t i) {
                   return conveyor({{"controller.precision", "float"},
                                    {"estimator.0.precision", "float"},
                                    {"estimator.2.precision", "float"},
                                    {"belief.rotor_resistance", number(0.7 + 0.1 * of(i))}});
                 },
                 own_run});
  all.push_back({"process noise",
                 [=](std::size_t i) {
                   return conveyor({{"process_noise.load_torque_Nm", number(i % 3 == 0 ? 0.0 : of(i))},
                                    {"process_noise.current_A", number(i % 4 == 1 ? 0.0 : 0.01 * of(i))},
                                    {"process_noise.flux_Wb", number(i % 2 == 0 ? 0.0 : 1e-4 * of(i))}});
                 },
                 own_run});
  all.push_back({"torque control on an imposed speed",
                 [=](std::size_t i) {
                   const std::string at = number(0.02 + 0.002 * of(i));
                   return shipped("winder_torque",
                                  {{"run.duration_s", "0.06"},
                                   {"score.from_s", "0.0"},
                                   {"load.0.speed_rpm", "[[0.0, 0.0], [" + at + ", 600.0]]"},
                                   {"reference.torque_Nm", "[[0.0, 0.0], [" + at + ", 7.0], [0.05, 17.5]]"}});
                 },
                 same_run});
  for (const char* estimator : {"luenberger", "reduced", "ekf"}) {
    all.push_back({std::string("sensorless, ") + estimator,
                   [=](std::size_t i) {
                     return shipped("loaded_reversal", {{"run.duration_s", "0.05"},
                                                        {"score.from_s", "0.0"},
                                                        {"run.start", "magnetised"},
                                                        {"controller.speed_from", estimator},
                                                        {"controller.orientation", "direct"},
                                                        {"controller.flux_from", estimator},
                                                        {"reference.speed_rpm", "[[0.0, 0.0], [0.03, 200.0]]"},
                                                        {"estimator.0.adaptation_bandwidth_Hz", number(40.0 + of(i))},
                                                        {"belief.stator_resistance", number(0.9 + 0.03 * of(i))}});
                   },
                   same_run});
  }
  all.push_back(steady_family());
  for (const char* method : {"euler", "midpoint", "cash_karp5"}) {
    const bool sine = method[0] == 'm';
    all.push_back({std::string("stepped by ") + method,
                   [=](std::size_t i) {
                     return conveyor({{"run.method", method},
                                      {"run.duration_s", "0.03"},
                                      {"run.trace_period_s", "30e-6"},  // between control ticks, too
                                      {"run.start", "standstill"},
                                      {"run.initial_speed_rpm", number(10.0 * of(i))},
                                      {"controller.delay_periods", sine ? "0" : "2"},
                                      {"supply.modulation", sine ? "sine" : "discontinuous"},
                                      {"supply.dc_link_V", number(500.0 + 10.0 * of(i))},
                                      {"estimator.2.load_torque", sine ? "1" : "0"}});
                   },
                   same_run});
  }
  return all;
}

// Case 1, and 2 later, leave all bounds; the first family by its speed, the second by its flux, the third by its estimate.
inline std::vector<Family> failing_families() {
  std::vector<Family> all;
  const auto numbered = [](std::size_t i) {
    Scenario s = conveyor({});
    s.belief.rotor_resistance = 0.8 + 0.05 * static_cast<double>(i);
    return s;
  };
  all.push_back({"runaway speed",
                 [=](std::size_t i) {
                   Scenario s = numbered(i);
                   if (i == 1 || i == 2)
                     s.loads[1].torque_profile = {{0.0, 0.0}, {0.01 * static_cast<double>(i), -1e6}};
                   return s;
                 },
                 same_run});
  all.push_back({"runaway flux",
                 [=](std::size_t i) {
                   Scenario s = numbered(i);
                   if (i == 1 || i == 2)
                     s.drifts[0].factor = {{0.01, 1.0}, {0.01 * static_cast<double>(i) + 0.01, 1e7}};
                   return s;
                 },
                 same_run});
  all.push_back({"estimate that is no number",
                 [=](std::size_t i) {
                   Scenario s = numbered(i);
                   s.controller.speed_from = "luenberger";
                   if (i == 1) s.belief.stator_resistance = 1e200;
                   return s;
                 },
                 same_run});
  return all;
}

}  // namespace slipbench::pack_tests
