// Machines: forms of the circuit, nameplate, machine files, belief.
#include <catch2/catch.hpp>
#include <complex>
#include <filesystem>
#include <fstream>

#include "plant/steady_state.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

const std::filesystem::path machines = std::filesystem::path(SLIPBENCH_SOURCE_DIR) / "configs" / "machines";

struct Point {
  double torque, current, power, flux, power_factor, efficiency;
};

// Steady state of the T circuit at rated voltage, frequency and speed by mesh currents: the textbook way, other than the
// closed form in the sources.
Point rated_point(const Circuit<double>& c, const Nameplate& plate) {
  using Complex = std::complex<double>;
  const Complex j(0.0, 1.0);
  const double w = plate.angular_frequency(), slip = 1.0 - c.pole_pairs * plate.speed_rad_s() / w;
  const Complex rotor = c.rotor_resistance / slip + j * w * c.rotor_leakage, mutual = j * w * c.magnetizing_inductance;
  const Complex z = c.stator_resistance + j * w * c.stator_leakage + mutual * rotor / (mutual + rotor);
  const Complex stator_current = plate.line_voltage_V / std::sqrt(3.0) / z;
  const Complex rotor_current = stator_current * mutual / (mutual + rotor);
  const double torque = 3.0 * std::norm(rotor_current) * c.rotor_resistance / slip * c.pole_pairs / w;
  const Complex flux = c.magnetizing_inductance * (stator_current - rotor_current) - c.rotor_leakage * rotor_current;
  const double power = torque * plate.speed_rad_s();
  const double input = 3.0 * std::real(plate.line_voltage_V / std::sqrt(3.0) * std::conj(stator_current));
  return {torque,
          std::abs(stator_current),
          power,
          std::sqrt(2.0) * std::abs(flux),
          std::cos(std::arg(stator_current)),
          power / input};
}

std::string folder_with(const std::string& name, const std::string& text) {
  const auto folder = std::filesystem::path(SLIPBENCH_BINARY_DIR) / "scenario_files";
  std::filesystem::create_directories(folder);
  std::ofstream(folder / name, std::ios::binary) << text;
  return folder.string();
}

std::string with_file(const std::string& file) {
  const std::string text = mains_text();
  const std::size_t from = text.find("pole_pairs"), to = text.find("[shaft]");
  return text.substr(0, from) + "file = \"" + file + "\"\n" + text.substr(to);
}

}  // namespace

TEST_CASE("machine files: published circuits have their published inductances", "[scenario][published]") {
  // P.C. Krause et al. (2002), Table 4.10-1; R. Krishnan (2001); M. Hinkkanen (2004), from memory. sigma recomputed from
  // the printed values; all 10 digits kept there are compared.
  const auto sigma = [](const char* file) {
    const Circuit<double> c = read_machine((machines / file).string()).circuit();
    return 1.0 - c.magnetizing_inductance * c.magnetizing_inductance / (c.stator_inductance() * c.rotor_inductance());
  };
  CHECK(sigma("krause_3hp.toml") == Approx(0.05530624156).epsilon(1e-9));
  CHECK(sigma("krause_50hp.toml") == Approx(0.04462595847).epsilon(1e-9));
  CHECK(sigma("krishnan_5hp.toml") == Approx(0.06634521654).epsilon(1e-9));
  CHECK(sigma("hinkkanen_2k2.toml") == Approx(0.07335907336).epsilon(1e-9));
  const Circuit<double> c = read_machine((machines / "hinkkanen_2k2.toml").string()).circuit();
  CHECK(c.stator_leakage == 0.0209);
  CHECK(c.rotor_leakage == 0.0);
}

TEST_CASE("machine files: rated values that we computed are the circuit's", "[scenario][configs]") {
  const auto point = [](const char* file, const MachineSettings& m) {
    INFO(file);
    return rated_point(m.circuit(), m.nameplate());
  };
  for (const char* file : {"krause_3hp.toml", "krause_50hp.toml", "krishnan_5hp.toml", "demo_4kw.toml"}) {
    const MachineSettings m = read_machine((machines / file).string());
    const Point p = point(file, m);
    CHECK(m.rated_torque_Nm == Approx(p.torque).epsilon(0.01));  // 1 %: rounded to three or four digits
    CHECK(m.rated_current_A == Approx(p.current).epsilon(0.01));
  }
  const MachineSettings m = read_machine((machines / "demo_4kw.toml").string());
  const Point p = point("demo_4kw.toml", m);
  CHECK(m.rated_power_W == Approx(p.power).epsilon(0.001));              // chosen to within 0.1 %
  CHECK(m.rated_power_factor == Approx(p.power_factor).epsilon(0.005));  // two digits
  CHECK(m.rated_efficiency == Approx(p.efficiency).epsilon(0.001));      // three digits
}

TEST_CASE("rated rotor flux: equals the mesh currents' in all circuit forms", "[scenario][published]") {
  for (const auto& entry : std::filesystem::directory_iterator(machines)) {
    INFO(entry.path());
    const MachineSettings m = read_machine(entry.path().string());
    // Some 30 rounded operations each way.
    CHECK(rated_rotor_flux(m.circuit(), m.nameplate()) ==
          Approx(rated_point(m.circuit(), m.nameplate()).flux).epsilon(1e-13));
  }
  const Scenario s = read(with(whole_text(), "rotor_flux_Wb = 0.9\n", ""));
  CHECK(s.reference.rotor_flux_Wb == rated_rotor_flux(s.machine.circuit(), s.machine.nameplate()));
}

TEST_CASE("machine: gamma form has its leakage on the rotor's side", "[scenario][read]") {
  std::string text = with(mains_text(), "stator_leakage_H = 0.0062\nrotor_leakage_H = 0.0062\n",
                          "circuit = \"gamma\"\ntotal_leakage_H = 0.013\n");
  const Circuit<double> c = read(text).machine.circuit();
  CHECK(c.stator_leakage == 0.0);
  CHECK(c.rotor_leakage == 0.013);
  const auto error = error_of(with(text, "total_leakage_H = 0.013", "stator_leakage_H = 0.013"));
  CHECK(error.key() == "machine.stator_leakage_H");
  CHECK(error.message().find("circuit = \"gamma\"") != std::string::npos);
}

TEST_CASE("machine file: relative to the scenario, and keys of the scenario win", "[scenario][read]") {
  const std::string folder = machines.parent_path().string() + "/scenarios";
  std::string text = with_file("../machines/krause_3hp.toml");
  CHECK(read_scenario_text(text, "t", folder).machine.stator_resistance_ohm == 0.435);
  text = with(text, "file = ", "stator_resistance_ohm = 0.5\nfile = ");
  const Scenario s = read_scenario_text(text, "t", folder);
  CHECK(s.machine.stator_resistance_ohm == 0.5);
  CHECK(s.machine.rotor_resistance_ohm == 0.816);
  CHECK(s.machine.rated_torque_Nm == 14.03);
  CHECK(
      read_scenario_text(text, "t", folder, {{"machine.stator_resistance_ohm", "0.6"}}).machine.stator_resistance_ohm ==
      0.6);
  const Scenario other = read_scenario_text(text, "t", folder, {{"machine.file", "../machines/demo_4kw.toml"}});
  CHECK(other.machine.rotor_resistance_ohm == 1.29);
}

TEST_CASE("belief: factors on the true machine, or on a machine file of its own", "[scenario][read]") {
  const std::string folder = machines.string();
  std::string text = whole_text();
  Circuit<double> c = read(text).believed_circuit();
  CHECK(c.rotor_resistance == 1.29 * 0.8);
  CHECK(c.stator_resistance == 1.6);
  text = with(text, "[belief]\n", "[belief]\nfile = \"hinkkanen_2k2.toml\"\n");
  const Scenario s = read_scenario_text(text, "t", folder);
  CHECK(s.believed_circuit().rotor_resistance == 1.65 * 0.8);
  CHECK(s.machine.rotor_resistance_ohm == 1.29);
  try {
    read_scenario_text(with(text, "hinkkanen_2k2.toml", "none.toml"), "t", folder);
    FAIL("a missing belief file went through");
  } catch (const InputError& error) {
    CHECK(error.key() == "belief.file");
    CHECK(error.place().rfind("t:", 0) == 0);
  }
}

TEST_CASE("machine file: what is wrong in it is placed in it", "[scenario][broken]") {
  const auto error = [](const std::string& name, const std::string& text, const std::string& key = "machine.file") {
    const std::string folder = folder_with(name, text);
    try {
      read_scenario_text(with_file(name), "scenario.toml", folder);
    } catch (const InputError& e) {
      INFO(e.what());
      CHECK(e.key() == key);
      return e;
    }
    FAIL("read: " << name);
    return InputError("", "", "");
  };
  const std::string inside =
      (std::filesystem::path(SLIPBENCH_BINARY_DIR) / "scenario_files").lexically_normal().string();
  CHECK(error("typo.toml", "[machine]\npole_pears = 2\n", "machine.pole_pears").place() == inside + "/typo.toml:2:1");
  CHECK(error("syntax.toml", "[machine\n", "").place().rfind(inside + "/syntax.toml:1:", 0) == 0);
  CHECK(error("more.toml", "[machine]\n[run]\n", "run").place() == inside + "/more.toml:2:2");
  CHECK(error("chain.toml", "[machine]\nfile = \"x\"\n").place() == inside + "/chain.toml:2:1");
  CHECK(error("none_in_it.toml", "title = \"x\"\n", "machine").message().find("[machine]") != std::string::npos);
  CHECK(error("late.toml", "format = 2\n[machine]\n", "format").place() == inside + "/late.toml:1:10");
  CHECK(error("empty.toml", "").message().find("is empty") != std::string::npos);
  CHECK(error("empty.toml", "").place().rfind("scenario.toml:7:8", 0) == 0);
}
