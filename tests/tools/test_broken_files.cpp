// Broken input through the command: each is refused with exit status 2, a place, and one text in both forms.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

namespace {

struct Broken {
  const char* name;
  const char* what;      // this text of the scenario
  const char* by;        // becomes that
  const char* mentions;  // and the message or key says this
};

const Broken table[] = {
    {"unclosed string", "\"rk4\"", "\"rk4", ""},
    {"unclosed array", "[0.2, 10.0]]", "[0.2, 10.0]", ""},
    {"twice the same key", "pole_pairs = 2", "pole_pairs = 2\npole_pairs = 2", ""},
    {"twice the same table", "[shaft]", "[run]", ""},
    {"no equals sign", "dc_link_V = 560.0", "dc_link_V 560.0", ""},
    {"text for a number", "inertia_kgm2 = 0.02", "inertia_kgm2 = \"heavy\"", "inertia_kgm2"},
    {"number for a text", "kind = \"inverter\"", "kind = 3", "kind"},
    {"text for an array", "torque_Nm = [[0.0, 0.0], [0.2, 0.0], [0.2, 10.0]]", "torque_Nm = \"lots\"", "torque_Nm"},
    {"flat array for knots", "[[0.0, 0.0], [0.02, 0.0], [0.12, 500.0]]", "[0.0, 500.0]", "speed_rpm"},
    {"knot of three", "[0.12, 500.0]", "[0.12, 500.0, 1.0]", "speed_rpm"},
    {"knots out of order", "[0.12, 500.0]", "[0.01, 500.0]", "speed_rpm"},
    {"boolean for a number", "duration_s = 0.3", "duration_s = true", "duration_s"},
    {"fraction for a count", "pole_pairs = 2", "pole_pairs = 2.5", "pole_pairs"},
    {"date for a number", "noise_A = 0.1", "noise_A = 2020-01-01", "noise_A"},
    {"table for a number", "noise_V = 0.5", "noise_V = { a = 1 }", "noise_V"},
    {"NaN", "stator_resistance_ohm = 1.6", "stator_resistance_ohm = nan", "stator_resistance_ohm"},
    {"infinity", "duration_s = 0.3", "duration_s = inf", "duration_s"},
    {"huge number", "inertia_kgm2 = 0.02", "inertia_kgm2 = 1e400", "1e400"},
    {"huge duration", "duration_s = 0.3", "duration_s = 1e300", "duration_s"},
    {"negative resistance", "rotor_resistance_ohm = 1.25", "rotor_resistance_ohm = -1.25", "rotor_resistance_ohm"},
    {"no inertia", "inertia_kgm2 = 0.02", "inertia_kgm2 = 0.0", "inertia_kgm2"},
    {"no pole pairs", "pole_pairs = 2", "pole_pairs = 0", "pole_pairs"},
    {"negative noise", "noise_A = 0.1", "noise_A = -0.1", "noise_A"},
    {"two and a half sensors", "phases = 3", "phases = 1", "phases"},
    {"control period no multiple of the step", "plant_step_s = 50e-6", "plant_step_s = 30e-6", "control_period_s"},
    {"duration no multiple of the trace period", "trace_period_s = 100e-6", "trace_period_s = 0.07", "duration_s"},
    {"step of nothing", "plant_step_s = 50e-6", "plant_step_s = 0.0", "plant_step_s"},
    {"unknown key", "inertia_kgm2", "inertia_kgm3", "inertia_kgm2"},
    {"unknown table", "[shaft]", "[shaft]\ninertia_kgm2 = 0.02\n[shafts]", "shaft"},
    {"missing key", "inertia_kgm2 = 0.02\n", "", "inertia_kgm2"},
    {"missing supply", "[supply]\nkind = \"inverter\"\ndc_link_V = 560.0\nswitching_frequency_Hz = 10e3\n", "",
     "supply"},
    {"missing machine file", "[machine]", "[machine]\nfile = \"nowhere.toml\"", "nowhere.toml"},
    {"unknown method", "method = \"rk4\"", "method = \"rk5\"", "rk4"},
    {"unknown load", "kind = \"profile\"", "kind = \"profil\"", "profile"},
    {"unknown estimator", "kind = \"extended_kalman\"", "kind = \"extended_kalmann\"", "extended_kalman"},
    {"unknown controller", "kind = \"rotor_flux_oriented\"", "kind = \"rotor_flux\"", "rotor_flux_oriented"},
    {"unknown speed sensor", "kind = \"ideal\"", "kind = \"perfect\"", "ideal"},
    {"two estimators of one name", "name = \"ekf\"", "name = \"obs\"", "obs"},
    {"an estimator's name with a dot", "name = \"ekf\"", "name = \"e.kf\"", "name"},
    {"speed from an estimator that is not there", "speed_from = \"measured\"", "speed_from = \"nobody\"", "nobody"},
    {"score window beyond the run", "from_s = 0.05", "from_s = 3.0", "from_s"},
    {"score window backwards", "from_s = 0.05", "from_s = 0.2\nto_s = 0.1", "score window"},
    {"a later format", "format = 1", "format = 99", "format"},
};

void check_refused(const Folder& folder, const std::string& file, const std::string& mentions) {
  for (const std::string verb : {"check", "run"}) {
    const Answer answer = folder.run({verb, file, "--json"}, "timeout 20");
    INFO(verb << ": " << answer.out << answer.err);
    REQUIRE(answer.status == 2);
    const auto error = answer.json().at("error");
    const std::string place = error["place"], key = error["key"], message = error["message"];
    CHECK(place.find(file.substr(file.rfind('/') + 1)) != std::string::npos);
    CHECK_FALSE(message.empty());
    CHECK((key + " " + message).find(mentions) != std::string::npos);
    CHECK(answer.err == place + ": " + message + "\n");
  }
}

}  // namespace

TEST_CASE("broken files: each is refused with its place and its key", "[tools][edge]") {
  const Folder folder;
  REQUIRE(folder.run({"check", folder.write("good.toml", scenario_text())}).status == 0);
  for (const Broken& broken : table) {
    INFO(broken.name);
    check_refused(folder, folder.write("broken.toml", replaced(scenario_text(), broken.what, broken.by)),
                  broken.mentions);
  }
}

TEST_CASE("broken files: cut off anywhere, none does anything but pass or be refused", "[tools][edge]") {
  const Folder folder;
  const std::string text = scenario_text();
  for (std::size_t length = 0; length < text.size(); length += 97) {
    const std::string file = folder.write("cut.toml", text.substr(0, length));
    const Answer answer = folder.run({"check", file, "--json"}, "timeout 20");
    INFO(length << ": " << answer.err);
    CHECK((answer.status == 2 || (answer.status == 0 && length > text.find("[reference]"))));
  }
}

TEST_CASE("broken files: no text at all", "[tools][edge]") {
  const Folder folder;
  std::string binary;
  for (int i = 0; i < 4096; ++i) binary += static_cast<char>(i * 131 % 256);
  check_refused(folder, folder.write("binary.toml", binary), "");
  check_refused(folder, folder.write("empty.toml", ""), "");
  check_refused(folder, folder.write("zeros.toml", std::string(1000, '\0')), "");
  check_refused(folder, folder.write("brackets.toml", "a = " + std::string(100000, '[')), "");
  check_refused(folder, folder.write("latin.toml", replaced(scenario_text(), "Short", "K\xfcrz")), "");
  check_refused(folder, folder.file("missing.toml"), "");
  fs::create_directory(folder.file("folder.toml"));
  check_refused(folder, folder.file("folder.toml"), "");
}

TEST_CASE("broken --set: placed at the key", "[tools][edge]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  for (const std::string set :
       {"run.duration_s=nan", "run.duration_s=-1", "shaft.inertia=1.0", "run.plant_step_s=abc",
        "estimator.7.kind=luenberger", "load.0.torque_Nm=[[1.0", "machine.file=nowhere.toml", "a..b=1", "run=3"}) {
    const Answer answer = folder.run({"run", file, "--json", "--set", set});
    INFO(set << ": " << answer.out << answer.err);
    REQUIRE(answer.status == 2);
    CHECK(answer.json()["error"]["place"].get<std::string>().rfind("--set:", 0) == 0);
  }
}
