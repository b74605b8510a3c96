// Reading good files: every key arrives where it belongs, defaults, the files of configs/.
#include <catch2/catch.hpp>
#include <chrono>
#include <filesystem>

#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

TEST_CASE("scenario: every key of the format arrives", "[scenario][read]") {
  const Scenario s = read(whole_text());
  CHECK(s.title == "all of it");
  CHECK(s.seed == 5);
  CHECK(s.run.duration_s == 2.0);
  CHECK(s.run.plant_step_s == 10e-6);
  CHECK(s.run.control_period_s == 100e-6);
  CHECK(s.run.trace_period_s == 1e-3);
  CHECK(s.run.method == "midpoint");
  CHECK(s.run.start == "standstill");
  CHECK(s.run.initial_speed_rpm == 3.0);
  CHECK(s.machine.pole_pairs == 2);
  CHECK(s.machine.stator_resistance_ohm == 1.6);
  CHECK(s.machine.rotor_resistance_ohm == 1.29);
  CHECK(s.machine.stator_leakage_H == 0.0062);
  CHECK(s.machine.rotor_leakage_H == 0.0061);
  CHECK(s.machine.magnetizing_inductance_H == 0.172);
  CHECK(s.machine.rated_power_W == 4000.0);
  CHECK(s.machine.rated_line_voltage_V == 400.0);
  CHECK(s.machine.rated_current_A == 7.85);
  CHECK(s.machine.rated_frequency_Hz == 50.0);
  CHECK(s.machine.rated_speed_rpm == 1440.0);
  CHECK(s.machine.rated_torque_Nm == 26.5);
  CHECK(s.machine.rated_power_factor == 0.82);
  CHECK(s.machine.rated_efficiency == 0.9);
  CHECK(s.machine.connection == "delta");
  CHECK(s.machine.resistance_temperature_degC == 75.0);
  CHECK(s.shaft.inertia_kgm2 == 0.05);
  CHECK(s.shaft.viscous_friction_Nms == 0.002);
  CHECK(s.shaft.coulomb_friction_Nm == 0.5);
  CHECK(s.shaft.friction_width_rpm == 2.0);
  REQUIRE(s.loads.size() == 3);
  CHECK(s.loads[0].torque_profile == Knots{{0.0, 0.0}, {0.5, 0.0}, {0.5, 8.0}});
  CHECK(s.loads[1].torque_Nm == 2.0);
  CHECK(s.loads[2].rated_torque_Nm == 10.0);
  CHECK(s.loads[2].rated_speed_rpm == 1500.0);
  CHECK(s.supply.dc_link_V == 560.0);
  CHECK(s.supply.switching_frequency_Hz == 10e3);
  CHECK(s.supply.dead_time_s == 2e-6);
  CHECK(s.supply.device_drop_V == 1.0);
  CHECK(s.supply.zero_current_width_A == 0.3);
  CHECK(s.supply.modulation == "discontinuous");
  CHECK(s.process_noise.load_torque_Nm == 0.1);
  CHECK(s.process_noise.current_A == 0.01);
  CHECK(s.process_noise.flux_Wb == 1e-4);
  CHECK(s.sensors.current_phases == 2);
  CHECK(s.sensors.current.present);
  CHECK(s.sensors.current.noise == 0.1);
  CHECK(s.sensors.current.offset == std::array<double, 3>{0.01, -0.02, 0.0});
  CHECK(s.sensors.current.gain_error == std::array<double, 3>{0.01, -0.01, 0.0});
  CHECK(s.sensors.current.bandwidth_Hz == 20e3);
  CHECK(s.sensors.current.bits == 12);
  CHECK(s.sensors.current.range == 30.0);
  CHECK_FALSE(s.sensors.voltage.present);
  CHECK(s.sensors.dc_link.present);
  CHECK(s.sensors.dc_link.noise == 0.5);
  CHECK(s.sensors.dc_link.gain_error[0] == 0.005);
  CHECK(s.sensors.dc_link.bits == 10);
  CHECK(s.sensors.dc_link.range == 800.0);
  CHECK(s.sensors.speed.kind == "encoder");
  CHECK(s.sensors.speed.lines_per_rev == 2048);
  CHECK(s.sensors.speed.clock_Hz == 20e6);
  CHECK(s.sensors.speed.window_s == 2e-3);
  CHECK(s.sensors.speed.timeout_s == 0.2);
  CHECK(s.reference.speed_rpm == Knots{{0.0, 0.0}, {0.2, 0.0}, {0.7, 1200.0}});
  CHECK(s.reference.rotor_flux_Wb == 0.9);
  CHECK(s.controller.kind == "rotor_flux_oriented");
  CHECK(s.controller.orientation == "direct");
  CHECK(s.controller.flux_from == "ekf");
  CHECK(s.controller.speed_from == "fast_1");
  CHECK(s.controller.delay_periods == 0);
  CHECK_FALSE(s.controller.dead_time_compensation);
  CHECK(s.controller.settings.value("current_bandwidth_Hz", -1.0) == 300.0);
  REQUIRE(s.estimators.size() == 2);
  CHECK(s.estimators[0].name == "ekf");
  CHECK(s.estimators[0].settings.value("load_torque", -1.0) == 1.0);
  CHECK(s.estimators[1].kind == "luenberger");
  CHECK(s.estimators[1].settings.value("adaptation_bandwidth_Hz", -1.0) == 80.0);
  CHECK(s.estimators[1].settings.given().size() == 1);
  CHECK(s.belief.rotor_resistance == 0.8);
  CHECK(s.belief.stator_resistance == 1.0);
  CHECK(s.belief.inertia == 1.2);
  CHECK(s.belief.dead_time == 0.0);
  CHECK(s.believed_inertia() == 0.05 * 1.2);
  REQUIRE(s.drifts.size() == 1);
  CHECK(s.drifts[0].quantity == "rotor_resistance");
  CHECK(s.drifts[0].factor == Knots{{0.0, 1.0}, {1.0, 1.0}, {2.0, 1.5}});
  CHECK(s.score.from_s == 0.5);
  CHECK(s.score.to_s == 1.5);
  CHECK(s.score.lost_error == 0.2);
  CHECK(s.score.lost_for_s == 0.1);
  CHECK(s.score.settled_error == 0.03);
}

TEST_CASE("scenario: defaults stand where the file is silent", "[scenario][read]") {
  const Scenario s = read(mains_text());
  CHECK(s.seed == 1);
  CHECK(s.run.method == "rk4");
  CHECK(s.run.start == "standstill");
  CHECK(s.machine.circuit_form == "t");
  CHECK(s.sensors.current_phases == 3);
  CHECK(s.sensors.speed.kind == "none");
  CHECK(s.score.from_s == 0.0);
  CHECK(s.score.to_s == 0.1);
  CHECK(s.supply.phase_deg == 0.0);
  // Torque: 4000 W at 1440 rpm; three sums and products of doubles lose less than 1e-14.
  CHECK(s.machine.rated_torque_Nm == Approx(4000.0 / (1440.0 * 3.141592653589793 / 30.0)).epsilon(1e-14));
}

TEST_CASE("scenario: defaults that follow from other keys", "[scenario][read]") {
  std::string text = with(whole_text(), "switching_frequency_Hz = 10e3\n", "");
  text = with(text, "zero_current_width_A = 0.3\n", "");
  text = with(text, "window_s = 2e-3\n", "");
  text = with(text, "control_period_s = 100e-6", "control_period_s = 150e-6");
  const Scenario s = read(text);
  CHECK(s.supply.switching_frequency_Hz == 1.0 / 150e-6);
  CHECK(s.supply.zero_current_width_A == Approx(0.02 * 7.85 * std::sqrt(2.0)).epsilon(1e-14));  // rounding only
  CHECK(s.sensors.speed.window_s == 150e-6 * 7.0);  // 1 ms is 6.67 control periods
}

TEST_CASE("scenario: imposed speed and torque reference", "[scenario][read]") {
  std::string text = mains_text() + "[[load]]\nkind = \"imposed_speed\"\nspeed_rpm = [[0, 1400], [1, -1400.5]]\n";
  CHECK(read(text).loads[0].speed_rpm == Knots{{0.0, 1400.0}, {1.0, -1400.5}});
  text = with(whole_text(), "speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.7, 1200.0]]", "torque_Nm = [[0, 5]]");
  CHECK(read(text).reference.torque_Nm == Knots{{0.0, 5.0}});
}

TEST_CASE("scenario: line endings, byte-order mark, order of tables do not matter", "[scenario][read]") {
  std::string text = mains_text(), dos;
  for (const char c : text) dos += c == '\n' ? std::string("\r\n") : std::string(1, c);
  CHECK(read("\xef\xbb\xbf" + dos).run.duration_s == 0.1);
  CHECK(read("title = \"\"\"\\\n  \u00e9tat\"\"\"\n" + text).title == "\u00e9tat");
  const std::size_t cut = text.find("[machine]");
  CHECK(read(text.substr(cut) + text.substr(0, cut)).run.duration_s == 0.1);
}

TEST_CASE("scenario: the files of configs/ read", "[scenario][configs]") {
  const std::filesystem::path configs = std::filesystem::path(SLIPBENCH_SOURCE_DIR) / "configs";
  std::size_t scenarios = 0, machines = 0;
  for (const auto& entry : std::filesystem::directory_iterator(configs / "scenarios")) {
    INFO(entry.path());
    CHECK(kind_of_file(entry.path().string()) == FileKind::scenario);
    const Scenario s = read_scenario(entry.path().string());
    CHECK(s.path == entry.path().string());
    CHECK_FALSE(s.title.empty());
    // Those of the current loop compare controllers, that of the board has the one estimator which its image holds, all others compare
    // the three that find the speed.
    const std::string name = entry.path().filename().string();
    if (!name.starts_with("current_loop")) CHECK(s.estimators.size() == (name.starts_with("board_") ? 1u : 3u));
    ++scenarios;
  }
  for (const auto& entry : std::filesystem::directory_iterator(configs / "machines")) {
    INFO(entry.path());
    CHECK(kind_of_file(entry.path().string()) == FileKind::machine);
    CHECK(read_machine(entry.path().string()).pole_pairs > 0);
    ++machines;
  }
  for (const auto& entry : std::filesystem::directory_iterator(configs / "gains")) {
    CHECK(kind_of_file(entry.path().string()) == FileKind::gains);
    CHECK_FALSE(read_gain_file(entry.path().string()).empty());
  }
  CHECK(scenarios >= 3);
  CHECK(machines >= 4);
}

TEST_CASE("scenario: a parsed file reads again quickly", "[scenario][speed]") {
  const ScenarioFile file(whole_text(), "file.toml", "/nowhere");
  const auto begin = std::chrono::steady_clock::now();
  for (int i = 0; i < 100; ++i) {
    REQUIRE(file.read({{"belief.rotor_resistance", "0." + std::to_string(i + 100)}}).belief.rotor_resistance > 0.09);
  }
  const double ms = std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - begin).count() / 100;
  CHECK(ms < 20.0);  // measured 0.1 ms; the bound only catches a reader gone quadratic, sanitizers and load included
}
