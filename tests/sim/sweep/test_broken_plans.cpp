// Broken plans: always an InputError at its line, with its key, what was found, what is allowed, and the way out.
#include <catch2/catch.hpp>
#include <random>

#include "sim/sweep/plan.hpp"
#include "tests/sim/sweep/plans.hpp"

using namespace slipbench;
using namespace sweep_tests;

namespace {

// The text with `from` made `to`; the error stands where `at` stands in the spoilt text.
struct Broken {
  const char *what, *from, *to, *at, *key, *says, *code;
};

const Broken grids[] = {
    {"misspelt table", "[[vary]]\nkey = ", "[[vry]]\nkey = ", "vry]]", "vry", "the nearest known key is 'vary'",
     "unknown_key"},
    {"misspelt key of the plan", "runs = 2", "rns = 2", "rns", "rns", "the nearest known key is 'runs'", "unknown_key"},
    {"misspelt key of a table", "values =", "value =", "value =", "vary.0.value",
     "the nearest known key is 'vary.0.values'", "unknown_key"},
    {"key that does not exist", "belief.rotor_resistance", "belief.rotor_resistence", "\"belief.rotor_resistence",
     "belief.rotor_resistence", "the nearest known key is 'belief.rotor_resistance'", "unknown_key"},
    {"coupled key that does not exist", "\"belief.rotor_leakage\"", "\"belief.rotor_leak\"", "\"belief.rotor_leak\"",
     "belief.rotor_leak", "the nearest known key is 'belief.rotor_leakage'", "unknown_key"},
    {"element that does not exist", "belief.rotor_resistance", "estimator.7.kind", "\"estimator.7", "estimator.7.kind",
     "is a list of 2", "unknown_key"},
    {"key that is no key", "belief.rotor_resistance", "belief..x", "\"belief..x", "belief..x", "is no dotted key",
     "unknown_key"},
    {"a table for a key", "belief.rotor_resistance", "belief", "0.7", "belief", "wanted is a table", "type"},
    {"scenario missing", "scenario = \"scenario.toml\"\n", "", "", "scenario", "missing key 'scenario'", "missing"},
    {"scenario that is no string", "scenario = \"scenario.toml\"", "scenario = 3", "3", "scenario",
     "3 (a whole number); wanted is a string", "type"},
    {"scenario that is not there", "\"scenario.toml\"", "\"nowhere.toml\"", "\"nowhere", "scenario",
     "there is no such file", "file"},
    {"scenario that is a folder", "\"scenario.toml\"", "\".\"", "\".\"", "scenario", "it is a folder", "file"},
    {"scenario without a name", "\"scenario.toml\"", "\"\"", "\"\"", "scenario", "the name is empty", "file"},
    {"scenario that is a plan", "\"scenario.toml\"", "\"plan.toml\"", "\"plan", "scenario",
     "this is a sweep plan; wanted is a scenario", "file"},
    {"scenario that is a machine", "\"scenario.toml\"", "\"machine.toml\"", "\"machine", "scenario",
     "this is a machine file; wanted is a scenario", "file"},
    {"no runs", "runs = 2", "runs = 0", "0\n", "runs", "wanted is a whole number from 1 to 1000000", "type"},
    {"half a run", "runs = 2", "runs = 2.5", "2.5", "runs", "2.5 (a real number)", "type"},
    {"too many runs", "runs = 2", "runs = 1000001", "1000001", "runs", "from 1 to 1000000", "type"},
    {"title that is a number", "title = \"grid\"", "title = 4", "4", "title", "4 (a whole number); wanted is a string",
     "type"},
    {"format of the future", "runs = 2", "format = 2", "2\n", "format", "wanted is a whole number from 1 to 1", "type"},
    {"vary as one table", "[[vary]]\nkey = \"belief.rotor_resistance\"\nvalues = [0.7, 1.0, 1.5]\n\n[[vary]]", "[vary]",
     "[vary]", "vary", "wanted is a list of tables, [[vary]]", "type"},
    {"no key", "key = \"belief.rotor_resistance\"\n", "", "[[vary]]\nvalues", "vary.0.key",
     "needs either key = \"...\" or keys = [...]", "missing"},
    {"key and keys", "key = \"belief.rotor_resistance\"",
     "key = \"shaft.inertia_kgm2\"\nkeys = [\"belief.rotor_resistance\"]", "[[vary]]\nkey = \"shaft", "vary.0.key",
     "needs either", "missing"},
    {"no keys", "[\"belief.stator_leakage\", \"belief.rotor_leakage\"]", "[]", "[]", "vary.1.keys", "at least one",
     "type"},
    {"keys that are numbers", "[\"belief.stator_leakage\", \"belief.rotor_leakage\"]", "[1, 2]", "1, 2", "vary.1.keys",
     "a list of strings", "type"},
    {"key that is a number", "key = \"belief.rotor_resistance\"", "key = 1", "1\nvalues", "vary.0.key",
     "1 (a whole number); wanted is a string", "type"},
    {"nothing to vary", "values = [0.7, 1.0, 1.5]\n", "", "[[vary]]\nkey = ", "vary.0.values",
     "a list, or from, to and count", "missing"},
    {"no values", "[0.7, 1.0, 1.5]", "[]", "[]", "vary.0.values", "a list that is not empty", "type"},
    {"values that are no list", "[0.7, 1.0, 1.5]", "0.7", "0.7", "vary.0.values", "0.7 (a real number)", "type"},
    {"list among values", "[0.7, 1.0, 1.5]", "[0.7, [1.0]]", "[1.0]", "vary.0.values", "an array of 1 values", "type"},
    {"value that is not finite", "[0.7, 1.0, 1.5]", "[0.7, nan]", "nan", "vary.0.values", "nan", "type"},
    {"value that is infinite", "[0.7, 1.0, 1.5]", "[0.7, inf]", "inf", "vary.0.values", "inf", "type"},
    {"value out of range", "[0.7, 1.0, 1.5]", "[0.7, -1.0]", "-1.0", "belief.rotor_resistance", "-1", "range"},
    {"word for a number", "[0.7, 1.0, 1.5]", "[0.7, \"much\"]", "\"much\"", "belief.rotor_resistance",
     "\"much\" (a string)", "type"},
    {"string of a number", "[0.7, 1.0, 1.5]", "[0.7, \"1.0\"]", "\"1.0\"", "belief.rotor_resistance",
     "\"1.0\" (a string)", "type"},
    {"word that is none of them", "key = \"belief.rotor_resistance\"\nvalues = [0.7, 1.0, 1.5]",
     "key = \"run.method\"\nvalues = [\"rk4\", \"rk5\"]", "\"rk5\"", "run.method",
     "one of euler, midpoint, rk4, cash_karp5", "range"},
    {"step that does not divide", "key = \"belief.rotor_resistance\"\nvalues = [0.7, 1.0, 1.5]",
     "key = \"run.plant_step_s\"\nvalues = [50e-6, 33e-6]", "33e-6", "run.control_period_s",
     "with run.plant_step_s = 3.3e-05: ", "relation"},
    {"key varied twice", "\"belief.stator_leakage\"", "\"belief.rotor_resistance\"", "\"belief.rotor_resistance\", ",
     "belief.rotor_resistance", "is varied twice", "relation"},
    {"key coupled to itself", "\"belief.stator_leakage\"", "\"belief.rotor_leakage\"", "\"belief.rotor_leakage\"]",
     "belief.rotor_leakage", "is varied twice", "relation"},
    {"names of columns", "key = \"belief.rotor_resistance\"\nvalues = [0.7, 1.0, 1.5]",
     "key = \"estimator.0.name\"\nvalues = [\"a\", \"b\"]", "\"estimator.0.name", "estimator.0.name",
     "names columns of the results", "relation"},
    {"from with values", "values = [0.7, 1.0, 1.5]", "values = [0.7, 1.0, 1.5]\nfrom = 1.0", "from = 1.0",
     "vary.0.from", "does not go with values", "relation"},
    {"from alone", "to = 1.2\ncount = 5", "", "[[vary]]\nkeys", "vary.1.to", "missing key 'vary.1.to'", "missing"},
    {"no count", "count = 5", "", "[[vary]]\nkeys", "vary.1.count", "missing key 'vary.1.count'", "missing"},
    {"count of one", "count = 5", "count = 1", "1\n", "vary.1.count", "a whole number from 2 to 1000000", "type"},
    {"count that is real", "count = 5", "count = 5.0", "5.0", "vary.1.count", "5 (a real number)", "type"},
    {"huge count", "count = 5", "count = 1000001", "1000001", "vary.1.count", "from 2 to 1000000", "type"},
    {"range of one value", "to = 1.2", "to = 0.8", "0.8\ncount", "vary.1.to", "another number than from", "type"},
    {"end that is not finite", "to = 1.2", "to = inf", "inf", "vary.1.to", "a finite number", "type"},
    {"end that is a word", "from = 0.8", "from = \"low\"", "\"low\"", "vary.1.from", "\"low\" (a string)", "type"},
    {"end out of range", "from = 0.8", "from = -0.8", "-0.8", "belief.stator_leakage", "-0.8", "range"},
    {"range too wide for doubles", "from = 0.8\nto = 1.2", "from = -1e308\nto = 1e308", "-1e308",
     "belief.stator_leakage", "", "range"},
    {"syntax", "runs = 2", "runs 2", "", "", "", "syntax"},
    {"twice the same key", "runs = 2", "runs = 2\nruns = 3", "", "", "", "syntax"},
};

const Broken draws[] = {
    {"vary beside sample", "[sample]", "[[vary]]\nkey = \"shaft.inertia_kgm2\"\nvalues = [0.02]\n[sample]",
     "sample]\nkind", "sample", "either crosses values or draws", "relation"},
    {"sample as a list",
     "[sample]\nkind = \"latin_hypercube\"\ncount = 70\nseed = 3\n\n[[sample.key]]\nkey = "
     "\"belief.rotor_resistance\"\ndistribution = \"uniform\"\nlow = 0.7\nhigh = 1.4\n\n[[sample.key]]",
     "[[sample]]", "[[sample]]", "sample", "wanted is a table", "type"},
    {"unknown kind", "\"latin_hypercube\"", "\"latin_hypercub\"", "\"latin", "sample.kind",
     "nearest is latin_hypercube", "type"},
    {"no kind", "kind = \"latin_hypercube\"\n", "", "[sample]", "sample.kind",
     "one of random, latin_hypercube, sobol, saltelli", "missing"},
    {"no count", "count = 70\n", "", "[sample]", "sample.count", "missing key 'sample.count'", "missing"},
    {"no points", "count = 70", "count = 0", "0\n", "sample.count", "a whole number from 1", "type"},
    {"points below zero", "count = 70", "count = -70", "-70", "sample.count", "-70", "type"},
    {"huge count", "count = 70", "count = 1000000000000", "1000000000000", "sample.count", "a whole number from 1",
     "type"},
    {"seed below zero", "seed = 3", "seed = -1", "-1", "sample.seed", "a whole number from 0", "type"},
    {"no distribution", "distribution = \"uniform\"\n", "", "[[sample.key]]", "sample.key.0.distribution",
     "one of uniform, normal", "missing"},
    {"unknown distribution", "\"uniform\"", "\"unifrom\"", "\"unifrom", "sample.key.0.distribution",
     "nearest is uniform", "type"},
    {"low above high", "low = 0.7", "low = 1.7", "1.4", "sample.key.0.high", "a number above low, 1.7", "type"},
    {"low equal to high", "low = 0.7", "low = 1.4", "1.4\n\n", "sample.key.0.high", "a number above low, 1.4", "type"},
    {"no high", "high = 1.4\n", "", "[[sample.key]]", "sample.key.0.high", "missing key 'sample.key.0.high'",
     "missing"},
    {"end not finite", "high = 1.4", "high = inf", "inf", "sample.key.0.high", "a finite number", "type"},
    {"mean of a uniform one", "low = 0.7", "low = 0.7\nmean = 1.0", "mean = 1.0", "sample.key.0.mean",
     "does not go with distribution = \"uniform\"", "relation"},
    {"low of a normal one", "sigma = 0.05", "sigma = 0.05\nlow = 1", "low = 1\n", "sample.key.1.low",
     "does not go with distribution = \"normal\"", "relation"},
    {"sigma of zero", "sigma = 0.05", "sigma = 0.0", "0.0", "sample.key.1.sigma", "a number above 0", "type"},
    {"low out of range", "low = 0.7", "low = -0.7", "-0.7", "belief.rotor_resistance", "-0.7", "range"},
    {"key that does not exist", "\"belief.rotor_resistance\"", "\"belief.rotor\"", "\"belief.rotor\"", "belief.rotor",
     "the nearest known key is", "unknown_key"},
    {"key drawn twice", "\"belief.stator_leakage\"", "\"belief.rotor_resistance\"", "\"belief.rotor_resistance\", ",
     "belief.rotor_resistance", "is varied twice", "relation"},
    {"structural key drawn", "key = \"belief.rotor_resistance\"\ndistribution = \"uniform\"\nlow = 0.7\nhigh = 1.4",
     "key = \"controller.delay_periods\"\ndistribution = \"uniform\"\nlow = 0\nhigh = 1", "\"controller.delay_periods",
     "controller.delay_periods", "cannot be drawn", "type"},
    {"seed drawn", "key = \"belief.rotor_resistance\"\ndistribution = \"uniform\"\nlow = 0.7\nhigh = 1.4",
     "key = \"seed\"\ndistribution = \"uniform\"\nlow = 1\nhigh = 9", "\"seed\"", "seed", "[[vary]]", "type"},
    {"no keys at all",
     "[[sample.key]]\nkey = \"belief.rotor_resistance\"\ndistribution = \"uniform\"\nlow = 0.7\nhigh = "
     "1.4\n\n[[sample.key]]\nkeys = [\"belief.stator_leakage\", \"belief.rotor_leakage\"]\ndistribution = "
     "\"normal\"\nmean = 1.0\nsigma = 0.05\n",
     "", "[sample]", "sample.key", "a list of tables, [[sample.key]]", "missing"},
};

std::string place_of(const std::string& path, const std::string& text, const std::string& at) {
  const std::size_t offset = text.find(at);
  if (offset == std::string::npos) throw std::runtime_error("the broken text has no '" + at + "'");
  const std::string before = text.substr(0, offset);
  const auto line = std::count(before.begin(), before.end(), '\n') + 1;
  const auto column = offset - (before.rfind('\n') == std::string::npos ? 0 : before.rfind('\n') + 1) + 1;
  return path + ":" + std::to_string(line) + ":" + std::to_string(column);
}

void check_broken(const Folder& folder, const std::string& whole, const Broken& b) {
  INFO(b.what);
  const std::string text = replaced(whole, b.from, b.to);
  const std::string path = write_plan(folder, text);
  try {
    (void)read_plan(path);
    FAIL("not refused");
  } catch (const InputError& e) {
    INFO(e.what());
    if (*b.at != '\0') CHECK(e.place() == place_of(path, text, b.at));
    CHECK(e.place().find(path + ":") == 0);
    if (*b.key != '\0') CHECK(e.key() == b.key);
    CHECK(e.message().find(b.says) != std::string::npos);
    CHECK(e.code() == b.code);
  }
}

InputError refused(const std::string& path, const std::vector<Override>& overrides,
                   std::optional<std::uint64_t> seed = {}) {
  try {
    (void)read_plan(path, overrides, seed);
  } catch (const InputError& e) {
    return e;
  }
  throw std::runtime_error("not refused");
}

}  // namespace

TEST_CASE("broken plans: place, key, found, allowed", "[sweep][broken]") {
  const Folder folder;
  for (const Broken& b : grids) check_broken(folder, grid_text(), b);
  for (const Broken& b : draws) check_broken(folder, drawn_text(), b);
}

TEST_CASE("broken plans: too many cases are counted", "[sweep][broken]") {
  const Folder folder;
  const std::string vary = "\n[[vary]]\nkey = \"belief.K\"\nfrom = 0.5\nto = 1.5\ncount = 100000\n";
  std::string text = "scenario = \"scenario.toml\"\n";
  for (const char* key : {"rotor_resistance", "stator_resistance", "inertia"}) text += replaced(vary, "K", key);
  const InputError e = refused(write_plan(folder, text), {});
  CHECK(e.place().find("plan.toml:1") != std::string::npos);  // the last [[vary]], line 15
  CHECK(e.message().find("1e+15 cases; allowed are at most 1000000000000") != std::string::npos);
  CHECK(e.code() == "range");
}

TEST_CASE("broken plans: what --set breaks is placed at --set", "[sweep][broken]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text());
  InputError e = refused(path, {{"plan.runs", "many"}});
  CHECK(e.place() == "--set:plan.runs");
  e = refused(path, {{"plan.vary.0.vals", "[1]"}});
  CHECK(e.place() == "--set:plan.vary.0.vals");
  CHECK(e.message().find("nearest known key is 'vary.0.values'") != std::string::npos);
  e = refused(path, {{"plan.vary.9.key", "x"}});
  CHECK(e.message().find("is a list of 2") != std::string::npos);
  e = refused(path, {{"shaft.inertia", "1"}});
  CHECK(e.place() == "--set:shaft.inertia");
  CHECK(e.message().find("shaft.inertia_kgm2") != std::string::npos);
  e = refused(path, {{"plan.scenario", "nowhere.toml"}});
  CHECK(e.place() == "--set:plan.scenario");
}

TEST_CASE("broken plans: --set or --seed of what the plan varies would do nothing, so it is refused",
          "[sweep][broken]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text());
  const InputError e = refused(path, {{"belief.rotor_resistance", "1.1"}});
  CHECK(e.place() == "--set:belief.rotor_resistance");
  CHECK(e.message().find(path + ":6:7") != std::string::npos);
  CHECK(e.message().find("--set plan.vary") != std::string::npos);
  const std::string seeds = folder.write(
      "seeds.toml", "scenario = \"scenario.toml\"\n[[vary]]\nkey = \"seed\"\nvalues = [1, 9007199254740993]\n");
  CHECK(read_plan(seeds).varies[0].values[1] == "9007199254740993");
  CHECK(refused(seeds, {}, 3).message().find("varies 'seed'") != std::string::npos);
}

TEST_CASE("broken plans: a broken scenario, or machine file, is told at its own line", "[sweep][broken]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text(), replaced(scenario_text(), "inertia_kgm2", "inertia"));
  CHECK(refused(path, {}).place() == folder.file("scenario.toml") + ":15:1");
  write_plan(folder, grid_text());
  folder.write("machine.toml", replaced(machine_text(), "1.25", "-1.25"));
  CHECK(refused(path, {}).place() == folder.file("machine.toml") + ":5:24");
  folder.write("machine.toml", machine_text());
  folder.write("bad.toml", replaced(machine_text(), "1.25", "-1.25"));
  const std::string machines = folder.write(
      "machines.toml",
      "scenario = \"scenario.toml\"\n[[vary]]\nkey = \"machine.file\"\nvalues = [\"machine.toml\", \"bad.toml\"]\n");
  const InputError e = refused(machines, {});
  CHECK(e.place() == machines + ":4:27");
  CHECK(e.message().find("bad.toml:5:24") != std::string::npos);
}

TEST_CASE("broken plans: no file, a folder, nothing in it", "[sweep][broken]") {
  const Folder folder;
  CHECK(refused(folder.file("none.toml"), {}).message().find("no such file") != std::string::npos);
  CHECK(refused(folder.file(""), {}).message().find("folder") != std::string::npos);
  CHECK(refused(folder.write("empty.toml", ""), {}).message().size() > 5);
}

TEST_CASE("broken plans: random damage is an InputError or a plan, never a crash", "[sweep][broken]") {
  const Folder folder;
  std::mt19937 dice(7);
  for (int round = 0; round < 400; ++round) {
    std::string text = round % 2 == 0 ? grid_text() : drawn_text();
    for (std::uint32_t hits = 1 + dice() % 3; hits > 0; --hits) {
      const std::size_t at = dice() % text.size();
      if (dice() % 2 == 0)
        text.erase(at, 1 + dice() % 4);
      else
        text[at] = static_cast<char>(dice() % 128);
    }
    const std::string path = write_plan(folder, text);
    try {
      (void)read_plan(path);
    } catch (const InputError& e) {
      REQUIRE(e.message().size() > 10);
    }
  }
}
