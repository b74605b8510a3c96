// Broken input: always an InputError, at its place, with its key, what was found and what is allowed; never a crash.
#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>
#include <random>

#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

// The text with `from` made `to`; the error stands where `at` stands in the spoilt text ("" : anywhere in the file).
struct Broken {
  const char *what, *from, *to, *at, *key, *says, *code;
};

const Broken table[] = {
    {"misspelt key", "duration_s = 2.0", "duraton_s = 2.0", "duraton_s", "run.duraton_s",
     "nearest known key is 'run.duration_s'", "unknown_key"},
    {"misspelt table", "[shaft]", "[shft]", "", "shaft", "missing table [shaft]", "missing"},
    {"misspelt optional table", "[belief]", "[beleif]", "beleif]", "beleif", "nearest known key is 'belief'",
     "unknown_key"},
    {"unknown top-level key", "seed = 5", "sed = 5", "sed", "sed", "'seed'", "unknown_key"},
    {"unit forgotten", "inertia_kgm2 = 0.05", "inertia = 0.05", "inertia =", "shaft.inertia", "'shaft.inertia_kgm2'",
     "unknown_key"},
    {"unknown key in a list", "kind = \"fan\"", "kind = \"fan\"\nrated_torqe_Nm = 1", "rated_torqe",
     "load.2.rated_torqe_Nm", "'load.2.rated_torque_Nm'", "unknown_key"},
    {"unknown estimator setting", "adaptation_bandwidth_Hz = 80", "adaption_bandwidth_Hz = 80", "adaption",
     "estimator.1.adaption_bandwidth_Hz", "'estimator.1.adaptation_bandwidth_Hz'", "unknown_key"},
    {"unknown sensor", "[sensors.dc_link]", "[sensors.dc_lnk]", "dc_lnk", "sensors.dc_lnk", "'sensors.dc_link'",
     "unknown_key"},
    {"missing required key", "pole_pairs = 2\n", "", "machine]", "machine.pole_pairs", "missing key", "missing"},
    {"missing key of a list", "torque_Nm = 2\n", "", "[[load]]\nkind = \"constant", "load.1.torque_Nm", "missing key",
     "missing"},
    {"missing kind", "kind = \"fan\"\n", "", "[[load]]\nrated", "load.2.kind",
     "one of profile, constant_torque, fan, imposed_speed", "missing"},
    {"string for a number", "duration_s = 2.0", "duration_s = \"2.0\"", "\"2.0\"", "run.duration_s",
     "\"2.0\" (a string); wanted is a number above 0", "type"},
    {"true for a number", "dc_link_V = 560.0", "dc_link_V = true", "true", "supply.dc_link_V",
     "true; wanted is a number", "type"},
    {"date for a number", "dc_link_V = 560.0", "dc_link_V = 2026-01-01", "2026", "supply.dc_link_V", "a date or time",
     "type"},
    {"array for a number", "noise_A = 0.1", "noise_A = [0.1]", "[0.1]", "sensors.current.noise_A",
     "an array of 1 values", "type"},
    {"table for a number", "noise_A = 0.1", "noise_A = {a = 1}", "{a", "sensors.current.noise_A", "a table", "type"},
    {"number for a string", "title = \"all of it\"", "title = 5", "5\n", "title",
     "5 (a whole number); wanted is a string", "type"},
    {"number for a word", "method = \"midpoint\"", "method = 4", "4\n", "run.method",
     "one of euler, midpoint, rk4, cash_karp5", "type"},
    {"number for a truth", "dead_time_compensation = false", "dead_time_compensation = 0", "0\ncurrent_b",
     "controller.dead_time_compensation", "true or false", "type"},
    {"real for a whole number", "pole_pairs = 2", "pole_pairs = 2.0", "2.0\nstator", "machine.pole_pairs",
     "2 (a real number); wanted is a whole number from 1 to 100", "type"},
    {"number for a table", "seed = 5\n", "seed = 5\nshaft = 3\n[x]\n", "", "", "", "syntax"},
    {"number for an optional table", "seed = 5\n", "seed = 5\nprocess_noise.a.b = 3\n", "", "", "", "syntax"},
    {"two numbers for three", "offset_A = [0.01, -0.02, 0]", "offset_A = [0.01, -0.02]", "[0.01, -0.02]",
     "sensors.current.offset_A", "three numbers [a, b, c]", "type"},
    {"string among numbers", "offset_A = [0.01, -0.02, 0]", "offset_A = [0.01, \"b\", 0]", "\"b\"",
     "sensors.current.offset_A.1", "\"b\" (a string)", "type"},
    {"table for a list", "[[drift]]", "[drift]", "[drift]", "drift", "[[drift]]", "type"},
    {"list for a table", "[run]", "[[run]]", "[[run]]", "run", "wanted is a table, [run]", "type"},
    {"unknown word", "method = \"midpoint\"", "method = \"rk5\"", "\"rk5\"", "run.method", "nearest is rk4", "range"},
    {"word in capitals", "connection = \"delta\"", "connection = \"Delta\"", "\"Delta\"", "machine.connection",
     "nearest is delta", "range"},
    {"unknown estimator", "kind = \"luenberger\"", "kind = \"luenburger\"", "\"luenburger\"", "estimator.1.kind",
     "nearest is luenberger", "range"},
    {"negative inertia", "inertia_kgm2 = 0.05", "inertia_kgm2 = -0.05", "-0.05", "shaft.inertia_kgm2", "above 0",
     "range"},
    {"zero inertia", "inertia_kgm2 = 0.05", "inertia_kgm2 = 0", "0\nviscous", "shaft.inertia_kgm2", "above 0", "range"},
    {"zero resistance", "rotor_resistance_ohm = 1.29", "rotor_resistance_ohm = 0.0", "0.0\nstator_leakage",
     "machine.rotor_resistance_ohm", "above 0", "range"},
    {"negative leakage", "stator_leakage_H = 0.0062", "stator_leakage_H = -0.001", "-0.001", "machine.stator_leakage_H",
     "from 0 to", "range"},
    {"negative noise", "noise_A = 0.1", "noise_A = -0.1", "-0.1", "sensors.current.noise_A", "from 0 to", "range"},
    {"no pole pairs", "pole_pairs = 2", "pole_pairs = 0", "0\nstator", "machine.pole_pairs", "from 1 to 100", "range"},
    {"efficiency above one", "rated_efficiency = 0.9", "rated_efficiency = 90", "90", "machine.rated_efficiency",
     "at most 1", "range"},
    {"four sensors", "phases = 2", "phases = 4", "4\nnoise", "sensors.current.phases", "from 2 to 3", "range"},
    {"NaN", "duration_s = 2.0", "duration_s = nan", "nan", "run.duration_s", "never NaN or infinity", "range"},
    {"infinity", "dc_link_V = 560.0", "dc_link_V = -inf", "-inf", "supply.dc_link_V", "never NaN or infinity", "range"},
    {"huge number", "dc_link_V = 560.0", "dc_link_V = 1e308", "1e308", "supply.dc_link_V", "at most", "range"},
    {"number beyond a double", "dc_link_V = 560.0", "dc_link_V = 1e999", "", "", "", ""},
    {"whole number beyond 64 bits", "seed = 5", "seed = 99999999999999999999", "", "", "not valid TOML", "syntax"},
    {"largest whole number", "pole_pairs = 2", "pole_pairs = 9223372036854775807", "9223372036854775807",
     "machine.pole_pairs", "from 1 to 100", "range"},
    {"tiny step", "plant_step_s = 10e-6", "plant_step_s = 1e-19", "2.0\nplant", "run.duration_s", "more than 1e15",
     "relation"},
    {"negative seed", "seed = 5", "seed = -5", "-5", "seed", "at least 0", "range"},
    {"format of tomorrow", "format = 1", "format = 2", "2\ntitle", "format", "equal to 1", "range"},
    {"missing machine file", "pole_pairs = 2", "file = \"none.toml\"\npole_pairs = 2", "\"none.toml\"", "machine.file",
     "there is no such file", "file"},
    {"folder for a machine file", "pole_pairs = 2", "file = \"/\"\npole_pairs = 2", "\"/\"", "machine.file",
     "is a folder", "file"},
    {"number for a machine file", "pole_pairs = 2", "file = 3\npole_pairs = 2", "3\npole", "machine.file",
     "wanted is a string", "type"},
    {"key given twice", "seed = 5", "seed = 5\nseed = 6", "", "", "not valid TOML", "syntax"},
    {"table given twice", "[belief]", "[score]\n[belief]", "", "", "not valid TOML", "syntax"},
    {"no value", "seed = 5", "seed =", "", "", "not valid TOML", "syntax"},
    {"no quotes", "method = \"midpoint\"", "method = midpoint", "", "", "not valid TOML", "syntax"},
    {"open string", "title = \"all of it\"", "title = \"all of it", "", "", "not valid TOML", "syntax"},
    {"open array", "[0.5, 8.0]]", "[0.5, 8.0]", "", "", "not valid TOML", "syntax"},
    {"open table", "[shaft]", "[shaft", "", "", "not valid TOML", "syntax"},
    {"decimal comma", "duration_s = 2.0", "duration_s = 2,0", "", "", "not valid TOML", "syntax"},
    {"unit after the number", "duration_s = 2.0", "duration_s = 2.0 s", "", "", "not valid TOML", "syntax"},
    {"broken UTF-8", "all of it", "all \xff it", "", "", "not valid TOML", "syntax"},
    {"odd table name", "[shaft]", "[%shaft]", "%shaft", "", "not valid TOML", "syntax"},
    {"letter beyond ASCII in the open", "seed = 5", "seed = 5\u00e9", "", "", "not valid TOML", "syntax"},
    {"escaped letter beyond ASCII", "all of it", "all \\\u00e9 it", "", "", "not valid TOML", "syntax"},
    {"control character", "all of it", "all \x01 it", "", "", "not valid TOML", "syntax"},
};

bool at_line_and_column(const std::string& place) {
  const std::size_t last = place.rfind(':'), first = last == std::string::npos ? last : place.rfind(':', last - 1);
  if (first == std::string::npos || place.substr(0, first) != "file.toml") return false;
  return std::stoi(place.substr(first + 1)) >= 1 && std::stoi(place.substr(last + 1)) >= 1;
}

// Reads what may be anything; true if it went through, false at an InputError, and no other way out.
bool reads(const std::string& text) {
  try {
    read(text);
    return true;
  } catch (const InputError& error) {
    REQUIRE_FALSE(error.message().empty());
    REQUIRE(error.place().rfind("file.toml", 0) == 0);
    return false;
  }
}

std::string refusal_of_file(const std::string& path) {
  try {
    read_scenario(path);
  } catch (const InputError& error) {
    CHECK(error.place().rfind(path, 0) == 0);
    return error.message();
  }
  return "";
}

}  // namespace

TEST_CASE("broken input: each is refused at its place, with key, finding and what is allowed", "[scenario][broken]") {
  for (const Broken& b : table) {
    INFO(b.what);
    const std::string spoilt = with(whole_text(), b.from, b.to);
    const InputError error = error_of(spoilt);
    INFO(error.what());
    CHECK(error.code() != "none");
    CHECK(error.key() == b.key);
    CHECK(error.message().find(b.says) != std::string::npos);
    if (*b.code != '\0') CHECK(error.code() == b.code);
    CHECK(at_line_and_column(error.place()));
    if (*b.at != '\0') CHECK(error.place() == place_of(spoilt, spoilt.find(b.at)));
  }
  CHECK(std::size(table) >= 40);
}

TEST_CASE("broken input: a file cut off at any byte never crashes", "[scenario][broken]") {
  const std::string text = whole_text();
  REQUIRE(reads(text));
  std::size_t through = 0;
  for (std::size_t n = 0; n < text.size(); ++n) through += reads(text.substr(0, n)) ? 1 : 0;
  // Only the optional tail, [score] and [[drift]] and [belief], may be cut without being missed; not half of the file.
  CHECK(through < text.size() / 4);
}

TEST_CASE("broken input: changed bytes never crash", "[scenario][broken]") {
  std::mt19937 random(1);  // fixed: the same spoilt texts each time
  const std::string text = whole_text();
  for (int i = 0; i < 400; ++i) {
    std::string spoilt = text;
    for (int k = 0; k < 1 + i % 4; ++k) spoilt[random() % spoilt.size()] = static_cast<char>(random() % 256);
    reads(spoilt);
    const std::size_t from = random() % text.size(), length = random() % 200;
    spoilt = text;
    spoilt.erase(from, length);
    reads(spoilt);
    spoilt.insert(random() % spoilt.size(), text.substr(from, length));
    reads(spoilt);
  }
}

TEST_CASE("broken input: nothing, noise, another kind of file", "[scenario][broken]") {
  CHECK_FALSE(reads(""));
  CHECK_FALSE(reads("\n\n# nothing\n"));
  CHECK_FALSE(reads(std::string(100, '\0')));
  std::mt19937 random(2);
  for (int i = 0; i < 50; ++i) {
    std::string noise(1 + random() % 2000, '\0');
    for (char& c : noise) c = static_cast<char>(random() % 256);
    CHECK_FALSE(reads(noise));
  }
  CHECK(error_of("[system]\nA = [[1]]\n").message().find("a state-space system") != std::string::npos);
  CHECK(error_of("scenario = \"x.toml\"\n").message().find("a sweep plan") != std::string::npos);
  CHECK(error_of("[machine]\npole_pairs = 2\n").message().find("a machine file") != std::string::npos);
  CHECK(error_of("a = 1\n").message().find("[run]") != std::string::npos);
  CHECK(error_of("[machine]\n[shaft]\n").key() == "run");
}

TEST_CASE("broken input: depth without bound does not exhaust the stack", "[scenario][broken]") {
  const auto repeated = [](const std::string& part, int times) {
    std::string out;
    for (int i = 0; i < times; ++i) out += part;
    return out;
  };
  for (const std::string& text :
       {"a = " + repeated("[", 1000000), "a = " + repeated("[", 100000) + repeated("]", 100000),
        "a = " + repeated("{a=", 300000) + "1", repeated("a.", 1000000) + "a = 1", "[" + repeated("a.", 1000000) + "a]",
        "[[" + repeated("a .\t", 500000) + "a]]", repeated("\"a\".", 500000) + "a = 1",
        "a = {" + repeated("b.", 500000) + "c = 1}", "'''\n'''.b = 1\n" + repeated("a.", 200000) + "a = 1"}) {
    CHECK_FALSE(reads(text));
  }
  const InputError error = error_of("x = 1\ny = " + repeated("[", 40));
  CHECK(error.place() == place_of("x = 1\ny = " + repeated("[", 40), 6 + 4 + 32));
  CHECK(error.message().find("nested deeper than 32") != std::string::npos);
  // Dots in strings, numbers and comments are no nesting.
  CHECK(read(with(whole_text(), "all of it", repeated(".", 1000))).title.size() == 1000);
  CHECK(read(with(whole_text(), "seed = 5", "seed = 5 # " + repeated("[.", 1000))).seed == 5);
  CHECK(read(with(whole_text(), "\"all of it\"", "'''\n" + repeated("[.", 1000) + "\"'''")).title.size() == 2001);
}

TEST_CASE("broken input: lists beyond sense are refused at once", "[scenario][broken]") {
  std::string text = whole_text();
  for (int i = 0; i < 100000; ++i) text += "[[estimator]]\n";
  const InputError error = error_of(text);
  CHECK(error.key() == "estimator");
  CHECK(error.message().find("100002") != std::string::npos);
}

TEST_CASE("broken input: files that are none", "[scenario][broken]") {
  const auto folder = std::filesystem::path(SLIPBENCH_BINARY_DIR) / "scenario_files";
  std::filesystem::create_directories(folder);
  const auto file = [&](const char* name, const std::string& bytes) {
    std::ofstream(folder / name, std::ios::binary) << bytes;
    return (folder / name).string();
  };
  CHECK(refusal_of_file((folder / "absent.toml").string()).find("there is no such file") != std::string::npos);
  CHECK(refusal_of_file((folder / "absent" / "absent.toml").string()).find("there is no such file") !=
        std::string::npos);
  CHECK(refusal_of_file(folder.string()).find("is a folder") != std::string::npos);
  CHECK(refusal_of_file("").find("there is no such file") != std::string::npos);
  CHECK(refusal_of_file(std::string(5000, 'x')).find("cannot be read") != std::string::npos);
  CHECK(refusal_of_file(file("empty_scenario.toml", "")).find("is empty") != std::string::npos);
  CHECK(refusal_of_file(file("huge.toml", std::string((4u << 20) + 1, '#'))).find("larger than 4 MiB") !=
        std::string::npos);
  CHECK(refusal_of_file("/dev/zero").find("larger than 4 MiB") != std::string::npos);
  CHECK(refusal_of_file("/dev/null").find("is empty") != std::string::npos);
  CHECK(refusal_of_file(file("binary.toml", std::string("\x7f"
                                                        "ELF\x02\x01\x01\0\0\0",
                                                        10)))
            .find("not valid TOML") != std::string::npos);
  CHECK_THROWS_AS(kind_of_file((folder / "absent.toml").string()), InputError);
  CHECK_THROWS_AS(read_machine((folder / "absent.toml").string()), InputError);
}

TEST_CASE("broken input: what is shown of it stays printable", "[scenario][broken]") {
  const InputError error =
      error_of(with(whole_text(), "method = \"midpoint\"", "method = \"a\\u0007\\n" + std::string(500, 'b') + "\""));
  CHECK(error.message().find("a\\x07\\x0a") != std::string::npos);
  CHECK(error.message().size() < 400);
  CHECK(error_of(whole_text(), {{"x\xff\n", "1"}}).key() == "x\\xff\\x0a");
}
