// State-space files: what a good one becomes, and that a broken one is refused at its place with key, finding and way out.
#include <catch2/catch.hpp>
#include <random>

#include "sim/scenario/system_file.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using scenario_tests::place_of;
using scenario_tests::with;

namespace {

const std::string text = R"(format = 1
title = "test plant"
source = "invented"

[system]
states = ["angle", "speed"]
inputs = ["torque", "load"]
outputs = ["angle", "speed"]
A = [[0.0, 1.0], [-4.0, -0.5]]
B = [[0.0, 0.0], [2.0, -2.0]]
C = [[1, 0], [0, 1]]
D = [[0.0, 0.0], [0.0, 0.25]]

[design]
kind = "lqr"
controlled_inputs = ["torque"]
tracked_outputs = ["angle"]
Q = [[1.0, 0.5], [0.5, 1.0]]
R = [[0.1]]
Q_integral = [[3.0]]
faster_than_controller = 4
)";

const std::string placed = R"([system]
A = [[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [-6.0, -11.0, -6.0]]
B = [[0.0], [0.0], [1.0]]
C = [[1.0, 0.0, 0.0]]
[design]
kind = "place"
poles = [[-2.0, 3.5], [-2.0, -3.5], -6]
observer_poles = [-5, -6, -7]
)";

SystemFile read(const std::string& from, const std::vector<Override>& overrides = {}) {
  return read_system_text(from, "file.toml", overrides);
}

InputError refused(const std::string& from, const std::vector<Override>& overrides = {}) {
  try {
    read(from, overrides);
  } catch (const InputError& error) {
    return error;
  }
  return {"", "", "", "none"};
}

// `from` made `to` in `base`; the error stands where `at` stands in the spoilt text ("": anywhere).
struct Broken {
  const char *what, *from, *to, *at, *key, *says, *code;
  const std::string* base = &text;
};

const Broken table[] = {
    {"no system", "[system]", "[sistem]", "", "system", "missing table [system]", "missing"},
    {"unknown table", "[design]", "[desgin]", "desgin", "desgin", "nearest known key is 'design'", "unknown_key"},
    {"unknown key", "D = [[0", "F = [[0", "F = ", "system.F", "unknown key 'system.F'", "unknown_key"},
    {"misspelt key", "states =", "state =", "state =", "system.state", "'system.states'", "unknown_key"},
    {"no A", "A = [[0.0, 1.0], [-4.0, -0.5]]\n", "", "system]", "system.A", "missing key 'system.A'", "missing"},
    {"no B", "B = [[0.0, 0.0], [2.0, -2.0]]\n", "", "system]", "system.B", "missing", "missing"},
    {"no C", "C = [[1, 0], [0, 1]]\n", "", "system]", "system.C", "missing", "missing"},
    {"A a number", "A = [[0.0, 1.0], [-4.0, -0.5]]", "A = 3", "3\n", "system.A", "a matrix as a list of rows", "type"},
    {"A flat", "A = [[0.0, 1.0], [-4.0, -0.5]]", "A = [0.0, 1.0]", "0.0, 1.0]", "system.A.0", "a row of numbers",
     "type"},
    {"A ragged", "[-4.0, -0.5]]", "[-4.0]]", "[-4.0]", "system.A.1", "a row of 2 numbers", "shape"},
    {"A not square", "A = [[0.0, 1.0], [-4.0, -0.5]]", "A = [[0.0, 1.0]]", "[[0.0, 1.0]]\nB", "system.A",
     "has 2 columns; wanted is 1, for A is square", "shape"},
    {"text in A", "-4.0", "\"-4.0\"", "\"-4.0\"", "system.A.1.0", "a number", "type"},
    {"NaN in A", "-4.0", "nan", "nan", "system.A.1.0", "finite", "range"},
    {"infinity in B", "2.0, -2.0", "2.0, -inf", "-inf", "system.B.1.1", "finite", "range"},
    {"huge in C", "[[1, 0]", "[[1e200, 0]", "1e200", "system.C.0.0", "1e+100", "range"},
    {"B of other order", "B = [[0.0, 0.0], [2.0, -2.0]]", "B = [[0.0, 0.0]]", "[[0.0, 0.0]]\nC", "system.B",
     "has 1 row; wanted are 2, as A has", "shape"},
    {"C of other order", "C = [[1, 0], [0, 1]]", "C = [[1], [0]]", "[[1], [0]]", "system.C",
     "has 1 column; wanted are 2, as A has", "shape"},
    {"D of other shape", "D = [[0.0, 0.0], [0.0, 0.25]]", "D = [[0.0, 0.0]]", "[[0.0, 0.0]]\n", "system.D",
     "wanted are 2, as C has", "shape"},
    {"E of other shape", "D = [[0.0, 0.0], [0.0, 0.25]]", "E = [[1.0]]", "[[1.0]]", "system.E", "as A has", "shape"},
    {"E that leaves a variable open", "A = [[0.0, 1.0], [-4.0, -0.5]]",
     "E = [[1.0, 0.0], [0.0, 0.0]]\nA = [[0.0, 0.0], [0.0, 0.0]]", "[[1.0, 0.0], [0.0, 0.0]]\nA", "system.E", "",
     "linear"},
    {"period of zero", "states =", "sample_period_s = 0.0\nstates =", "0.0\nstates", "system.sample_period_s",
     "above 0", "range"},
    {"period as text", "states =", "sample_period_s = \"1 s\"\nstates =", "\"1 s\"", "system.sample_period_s",
     "a finite number", "type"},
    {"too few names", "[\"angle\", \"speed\"]\ninputs", "[\"angle\"]\ninputs", "[\"angle\"]", "system.states",
     "has 1 name; wanted are 2", "shape"},
    {"a name twice", "[\"torque\", \"load\"]", "[\"torque\", \"torque\"]", "\"torque\"]", "system.inputs.1",
     "not there yet", "relation"},
    {"a name that is none", "[\"torque\", \"load\"]", "[\"torque\", 2]", "2]", "system.inputs.1", "a name", "type"},
    {"an empty name", "[\"torque\", \"load\"]", "[\"\", \"load\"]", "\"\"", "system.inputs.0", "1 to 60", "type"},
    {"another format", "format = 1", "format = 2", "2\n", "format", "from 1 to 1", "type"},
    {"title a number", "\"test plant\"", "4", "4\n", "title", "a string", "type"},
    {"no TOML", "A = [[0.0,", "A = [[0.0;", "", "", "not valid TOML", "syntax"},
    {"no kind", "kind = \"lqr\"\n", "", "design]", "design.kind", "one of lqr, place", "missing"},
    {"unknown kind", "\"lqr\"", "\"lqg\"", "\"lqg\"", "design.kind", "nearest is lqr", "type"},
    {"no Q", "Q = [[1.0, 0.5], [0.5, 1.0]]\n", "", "design]", "design.Q", "missing", "missing"},
    {"Q of other order", "Q = [[1.0, 0.5], [0.5, 1.0]]", "Q = [[1.0]]", "[[1.0]]", "design.Q",
     "wanted are 2, the system's order", "shape"},
    {"Q lopsided", "[0.5, 1.0]]", "[0.4, 1.0]]", "0.4", "design.Q.1.0", "must be symmetric", "relation"},
    {"R of other size", "R = [[0.1]]", "R = [[1.0, 0.0], [0.0, 1.0]]", "[[1.0, 0.0], [0.0, 1.0]]", "design.R",
     "as there are controlled inputs", "shape"},
    {"N turned", "Q_integral = [[3.0]]", "N = [[0.0, 0.1]]", "[[0.0, 0.1]]", "design.N", "wanted are 2", "shape"},
    {"integral weight of other size", "[[3.0]]", "[[3.0, 0.0], [0.0, 3.0]]", "[[3.0, 0", "design.Q_integral",
     "as there are tracked outputs", "shape"},
    {"integral action with a cross term", "Q_integral = [[3.0]]", "N = [[0.0], [0.1]]\nQ_integral = [[3.0]]", "N = [[0",
     "design.N", "give one of them", "relation"},
    {"unknown output", "[\"angle\"]", "[\"angel\"]", "\"angel\"", "design.tracked_outputs.0", "nearest is angle",
     "range"},
    {"unknown input", "[\"torque\"]", "[\"torqe\"]", "\"torqe\"", "design.controlled_inputs.0", "nearest is torque",
     "range"},
    {"nothing to follow", "[\"angle\"]\nQ", "[]\nQ", "[]\nQ", "design.tracked_outputs", "one name at least", "range"},
    {"key of another kind", "R = [[0.1]]", "R = [[0.1]]\npoles = [-1, -2]", "poles", "design.poles",
     "does not go with kind = \"lqr\"; it belongs to place, observer", "relation"},
    {"factor of zero", "faster_than_controller = 4", "faster_than_controller = 0", "0\n",
     "design.faster_than_controller", "above 0", "range"},
    {"observer twice", "faster_than_controller = 4", "faster_than_controller = 4\nobserver_poles = [-1, -2]", "faster",
     "design.faster_than_controller", "give one of them", "relation"},
    {"noise of the plant alone", "faster_than_controller = 4", "W = [[1.0, 0.0], [0.0, 1.0]]", "design]", "design.V",
     "missing", "missing"},
    {"poles too few", "[[-2.0, 3.5], [-2.0, -3.5], -6]", "[[-2.0, 3.5], [-2.0, -3.5]]", "[[-2.0, 3.5]", "design.poles",
     "has 2 poles; wanted are 3, the system's order", "shape", &placed},
    {"pole without its conjugate", "[-2.0, -3.5]", "[-2.0, -3.4]", "[-2.0, 3.5]", "design.poles.0",
     "its conjugate, -2 - 3.5j", "relation", &placed},
    {"pole of three numbers", "[-2.0, -3.5]", "[-2.0, -3.5, 1]", "[-2.0, -3.5, 1]", "design.poles.1", "[re, im]",
     "type", &placed},
    {"pole as text", "-6]", "\"-6\"]", "\"-6\"]", "design.poles.2", "a number for a real one", "type", &placed},
    {"pole not finite", "[-2.0, 3.5]", "[-inf, 3.5]", "-inf", "design.poles.0.0", "finite", "range", &placed},
    {"poles missing", "poles = [[-2.0, 3.5], [-2.0, -3.5], -6]\n", "", "design]", "design.poles", "missing", "missing",
     &placed},
    {"observer of nothing", "kind = \"place\"\npoles = [[-2.0, 3.5], [-2.0, -3.5], -6]\nobserver_poles = [-5, -6, -7]",
     "kind = \"observer\"", "design]", "design.poles", "or faster_than_controller", "missing", &placed},
    {"observer both ways", "kind = \"place\"\npoles = [[-2.0, 3.5], [-2.0, -3.5], -6]\nobserver_poles = [-5, -6, -7]",
     "kind = \"observer\"\npoles = [-1, -2, -3]\nfaster_than_controller = 4.0", "faster",
     "design.faster_than_controller", "give one of them", "relation", &placed},
    {"no noise", "kind = \"place\"\npoles = [[-2.0, 3.5], [-2.0, -3.5], -6]\nobserver_poles = [-5, -6, -7]",
     "kind = \"kalman\"", "design]", "design.W", "missing", "missing", &placed},
    {"no rule", "kind = \"place\"\npoles = [[-2.0, 3.5], [-2.0, -3.5], -6]\nobserver_poles = [-5, -6, -7]",
     "kind = \"pi\"", "design]", "design.rule", "magnitude_optimum, symmetric_optimum", "missing", &placed},
    {"factor of the other rule",
     "kind = \"place\"\npoles = [[-2.0, 3.5], [-2.0, -3.5], -6]\nobserver_poles = [-5, -6, -7]",
     "kind = \"pi\"\nrule = \"magnitude_optimum\"\nsymmetric_factor = 2.0", "symmetric_f", "design.symmetric_factor",
     "goes with rule", "relation", &placed},
};

}  // namespace

TEST_CASE("state-space file: matrices, names and design as they stand", "[scenario][system]") {
  const SystemFile file = read(text);
  CHECK(file.title == "test plant");
  CHECK(file.source == "invented");
  CHECK(file.system.order() == 2);
  CHECK(file.system.A(1, 0) == -4.0);
  CHECK(file.system.B(1, 1) == -2.0);
  CHECK(file.system.C(0, 0) == 1.0);
  CHECK(file.system.D(1, 1) == 0.25);
  CHECK_FALSE(file.system.discrete());
  CHECK(file.system.state_name(1) == "speed");
  CHECK(file.system.input_name(1) == "load");
  CHECK(file.redundant.empty());
  REQUIRE(file.design);
  CHECK(file.design->kind == DesignKind::lqr);
  CHECK(file.design->Q(0, 1) == 0.5);
  CHECK(file.design->Q_integral(0, 0) == 3.0);
  CHECK(file.design->tracked == std::vector<Eigen::Index>{0});
  CHECK(file.design->controlled == std::vector<Eigen::Index>{0});
  CHECK(file.design->faster_than_controller == 4.0);
  CHECK(file.design->place == place_of(text, text.find("[design]")));
}

TEST_CASE("state-space file: what may be left out", "[scenario][system]") {
  const SystemFile bare = read("[system]\nA = [[-1]]\nB = [[1]]\nC = [[2]]\nsample_period_s = 0.1\n");
  CHECK(bare.system.D.rows() == 1);
  CHECK(bare.system.D(0, 0) == 0.0);
  CHECK(bare.system.discrete());
  CHECK(bare.system.state_name(0) == "x1");
  CHECK_FALSE(bare.design);
  // No input at all, no output at all, no state at all.
  CHECK(read("[system]\nA = [[-1]]\nB = [[]]\nC = [[2]]\n").system.inputs() == 0);
  CHECK(read("[system]\nA = [[-1]]\nB = [[1]]\nC = []\n").system.outputs() == 0);
  const SystemFile gain = read("[system]\nA = []\nD = [[3.0, 4.0]]\n");
  CHECK(gain.system.order() == 0);
  CHECK(gain.system.inputs() == 2);
  CHECK(gain.system.C.rows() == 1);
  CHECK(refused("[system]\nA = []\nB = [[1.0]]\nC = []\nD = [[1.0]]\n").key() == "system.B");
  CHECK(refused("[system]\nA = []\n").key() == "system.D");
}

TEST_CASE("state-space file: poles as pairs or as numbers", "[scenario][system]") {
  const SystemFile file = read(placed);
  REQUIRE(file.design->poles.size() == 3);
  CHECK(file.design->poles[1] == linear::Complex(-2.0, -3.5));
  CHECK(file.design->poles[2] == linear::Complex(-6.0, 0.0));
  CHECK(file.design->observer_poles.size() == 3);
}

TEST_CASE("state-space file: --set changes it", "[scenario][system]") {
  CHECK(read(text, {{"system.A.1.0", "-9"}}).system.A(1, 0) == -9.0);
  CHECK(read(text, {{"system.sample_period_s", "0.5"}}).system.sample_period_s == 0.5);
  CHECK(read(text, {{"design.Q", "[[2, 0], [0, 2]]"}}).design->Q(0, 0) == 2.0);
  CHECK(read(with(text, "Q_integral = [[3.0]]", "N = [[0.0], [0.1]]")).design->N(1, 0) == 0.1);
  // A kind that is set leaves the file's keys for its own kind aside; keys that are set must go with it.
  const SystemFile other = read(text, {{"design.kind", "place"}, {"design.poles", "[-1, -2]"}});
  CHECK(other.design->kind == DesignKind::place);
  CHECK(other.design->Q.size() == 0);
  const InputError error = refused(text, {{"design.kind", "lqr"}, {"design.poles", "[-1, -2]"}});
  CHECK(error.key() == "design.poles");
  CHECK(error.place() == "--set:design.poles");
  CHECK(refused(text, {{"system.A.0.1", "wide"}}).key() == "system.A.0.1");
  CHECK(refused(text, {{"system.A.5.1", "1"}}).code() == "unknown_key");
  CHECK(refused(text, {{"system.G", "1"}}).place() == "--set:system.G");
}

TEST_CASE("state-space file: broken ones are refused at their place", "[scenario][system][broken]") {
  for (const Broken& b : table) {
    INFO(b.what);
    const std::string spoilt = with(*b.base, b.from, b.to);
    const InputError error = refused(spoilt);
    INFO(error.what());
    CHECK(error.code() == b.code);
    CHECK(error.key() == b.key);
    CHECK(error.message().find(b.says) != std::string::npos);
    CHECK(error.place().rfind("file.toml:", 0) == 0);
    if (*b.at != '\0') {
      const std::size_t from = std::string(b.at).find("design]") == 0 || std::string(b.at) == "system]" ? 1 : 0;
      CHECK(error.place() == place_of(spoilt, spoilt.find(b.at) - from));
    }
  }
  CHECK(std::size(table) >= 40);
}

TEST_CASE("state-space file: too large is refused, no matter how deep the list", "[scenario][system][broken]") {
  std::string rows;
  for (int i = 0; i < 61; ++i) {
    rows += rows.empty() ? "[" : ", [";
    for (int j = 0; j < 61; ++j) rows += j == 0 ? "0" : ", 0";
    rows += "]";
  }
  const InputError error = refused("[system]\nA = [" + rows + "]\nB = [[1]]\nC = [[1]]\n");
  CHECK(error.key() == "system.A");
  CHECK(error.message().find("at most 60") != std::string::npos);
}

TEST_CASE("state-space file: cut off or changed anywhere, it never crashes", "[scenario][system][broken]") {
  std::mt19937 random(3);  // fixed: the same spoilt texts each time
  for (std::size_t n = 0; n < text.size(); ++n) {
    std::string spoilt = text.substr(0, n);
    if (const InputError e = refused(spoilt); e.code() != "none") CHECK_FALSE(e.message().empty());
    spoilt = text;
    spoilt[n] = static_cast<char>(random() % 256);
    if (const InputError e = refused(spoilt); e.code() != "none") CHECK_FALSE(e.message().empty());
  }
}
