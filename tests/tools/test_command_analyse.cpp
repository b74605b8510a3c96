// The built command's `analyse` on state-space files: JSON as scripts rely on it, sentences as people read them.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

namespace {

const std::string systems = SLIPBENCH_SOURCE_DIR "/configs/systems/";

nlohmann::json analysed(const Folder& folder, std::vector<std::string> words) {
  words.insert(words.begin(), "analyse");
  words.push_back("--json");
  const Answer answer = folder.run(words);
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  CHECK(answer.err.empty());
  return answer.json();
}

std::string report(const Folder& folder, const std::vector<std::string>& words) {
  std::vector<std::string> all = {"analyse"};
  all.insert(all.end(), words.begin(), words.end());
  const Answer answer = folder.run(all);
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  return answer.out;
}

double at(const nlohmann::json& matrix, std::size_t i, std::size_t j) { return matrix.at(i).at(j).get<double>(); }

// Poles, zeros and gains of orders up to 3 with numbers near 1: a few tens of roundings.
Approx near(double x) { return Approx(x).epsilon(1e-12).margin(1e-12); }

}  // namespace

TEST_CASE("analyse: every key that scripts rely on", "[tools][command][contract]") {
  const Folder folder;
  const auto d = analysed(folder, {systems + "third_order_placed.toml"});
  for (const char* key : {"order", "poles", "stability", "controllable_rank", "observable_rank", "minimal_order",
                          "stabilisable", "detectable", "modes", "A", "B", "C", "D", "minimal", "dc_gain"})
    CHECK(d.contains(key));
  CHECK(d["order"] == 3);
  CHECK(d["stability"] == "stable");
  CHECK(d["controllable_rank"] == 3);
  CHECK(d["observable_rank"] == 3);
  CHECK(d["minimal_order"] == 3);
  CHECK(d["stabilisable"] == true);
  CHECK(d["detectable"] == true);
  CHECK(d["A"] == nlohmann::json::parse("[[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [-6.0, -11.0, -6.0]]"));
  // s^3 + 6 s^2 + 11 s + 6 = (s + 1)(s + 2)(s + 3), by hand; largest real part first.
  REQUIRE(d["poles"].size() == 3);
  for (std::size_t i = 0; i < 3; ++i) {
    CHECK(at(d["poles"], i, 0) ==
          Approx(-1.0 - static_cast<double>(i)).epsilon(1e-11));  // condition of these roots: about 100
    CHECK(at(d["poles"], i, 1) == 0.0);
    for (const char* key : {"pole", "controllable", "observable"}) CHECK(d["modes"][i].contains(key));
    CHECK(d["modes"][i]["pole"] == d["poles"][i]);
  }
  CHECK(at(d["dc_gain"], 0, 0) == near(1.0 / 6.0));
  CHECK(d["zeros"].empty());
  CHECK(d["hankel"].size() == 3);
  for (const char* key : {"A", "B", "C", "D"}) CHECK(d["minimal"].contains(key));
}

// A = [4 3; -4.5 -3.5], b = [1; -1], c = [3 2] (A.J. Laub 1979): s^2 - s/2 - 1/2 has the roots 1 and -1/2; by hand c b = 1 and
// c A b = 1, so that G = 1/(s - 1): the mode at -1/2 is hidden on both sides.
TEST_CASE("analyse: a hidden mode is named, and what it means", "[tools][command][published]") {
  const Folder folder;
  const auto d = analysed(folder, {systems + "hidden_mode.toml"});
  CHECK(at(d["poles"], 0, 0) == near(1.0));
  CHECK(at(d["poles"], 1, 0) == near(-0.5));
  CHECK(d["stability"] == "unstable");
  CHECK(d["controllable_rank"] == 1);
  CHECK(d["observable_rank"] == 1);
  CHECK(d["minimal_order"] == 1);
  CHECK(d["stabilisable"] == true);
  CHECK(d["detectable"] == true);
  CHECK(d["modes"][0]["controllable"] == true);
  CHECK(d["modes"][1]["controllable"] == false);
  CHECK(d["modes"][1]["observable"] == false);
  CHECK(at(d["minimal"]["A"], 0, 0) == near(1.0));
  CHECK(at(d["minimal"]["B"], 0, 0) * at(d["minimal"]["C"], 0, 0) == near(1.0));
  CHECK(at(d["dc_gain"], 0, 0) == near(-1.0));
  const std::string text = report(folder, {systems + "hidden_mode.toml"});
  CHECK_THAT(text, Catch::Contains("mode at -0.5 is moved by no input") && Catch::Contains("decays by itself"));
  CHECK_THAT(text,
             Catch::Contains("mode at -0.5 is seen at no output") && Catch::Contains("Verdict: unstable; pole 1 "));
  // The same with the sign of A turned: the hidden mode grows, and nothing can be done.
  const auto worse = analysed(folder, {systems + "hidden_mode.toml", "--set", "system.A=[[-4.0, -3.0], [4.5, 3.5]]"});
  CHECK(worse["stabilisable"] == false);
  CHECK(worse["detectable"] == false);
  CHECK_THAT(worse["stabilisable_why"].get<std::string>(), Catch::Contains("0.5"));
}

TEST_CASE("analyse: modal form, Kalman's decomposition and Gramians are told to scripts", "[tools][command]") {
  const Folder folder;
  const std::string lag = folder.write("lag.toml", "[system]\nA = [[-2.0]]\nB = [[2.0]]\nC = [[1.0]]\n");
  // b^2 / 2a and c^2 / 2a of x' = -a x + b u, y = c x (closed form).
  const auto one = analysed(folder, {lag});
  CHECK(at(one["gramians"]["controllability"], 0, 0) == near(1.0));
  CHECK(at(one["gramians"]["observability"], 0, 0) == near(0.25));
  // Roots -1, -2, -3 on the diagonal; A T = T A_z column by column.
  const auto three = analysed(folder, {systems + "third_order_placed.toml"});
  for (std::size_t j = 0; j < 3; ++j) {
    const double pole = -1.0 - static_cast<double>(j);
    CHECK(at(three["modal"]["A"], j, j) == Approx(pole).epsilon(1e-11));  // condition of these roots: about 100
    for (std::size_t i = 0; i < 3; ++i) {
      double AT = 0.0;
      for (std::size_t k = 0; k < 3; ++k) AT += at(three["A"], i, k) * at(three["modal"]["T"], k, j);
      CHECK(AT == Approx(pole * at(three["modal"]["T"], i, j)).margin(1e-11));
    }
  }
  // 1/(s - 1) is the part that is moved and seen, -1/2 the part that is neither (by hand, above).
  const auto hidden = analysed(folder, {systems + "hidden_mode.toml"});
  CHECK(at(hidden["kalman"]["A"], 0, 0) == near(1.0));
  CHECK(at(hidden["kalman"]["A"], 1, 1) == near(-0.5));
  CHECK(at(hidden["kalman"]["B"], 1, 0) == 0.0);
  CHECK(at(hidden["kalman"]["C"], 0, 1) == 0.0);
  CHECK(hidden["gramians"].is_null());
  const auto jordan = analysed(folder, {systems + "double_integrator_sampled.toml"});
  CHECK(jordan["modal"].is_null());
  CHECK_THAT(jordan["modal_why"].get<std::string>(), Catch::Contains("1"));
}

TEST_CASE("analyse: an integrator has no DC gain, and two grow", "[tools][command]") {
  const Folder folder;
  const std::string one = folder.write("one.toml", "[system]\nA = [[0.0]]\nB = [[2.0]]\nC = [[1.0]]\n");
  const auto d = analysed(folder, {one});
  CHECK(d["stability"] == "marginal");
  CHECK(d["dc_gain"].is_null());
  CHECK_FALSE(d["dc_gain_why"].get<std::string>().empty());
  CHECK(d["hankel"].is_null());
  const auto two = analysed(folder, {systems + "double_integrator_sampled.toml"});
  CHECK(two["stability"] == "unstable");
  CHECK(two["sample_period_s"] == 0.1);
  CHECK_THAT(two["stability_why"].get<std::string>(), Catch::Contains("Jordan"));
}

TEST_CASE("analyse: gain and phase at a frequency", "[tools][command]") {
  const Folder folder;
  const std::string lag = folder.write("lag.toml", "[system]\nA = [[-2.0]]\nB = [[2.0]]\nC = [[1.0]]\n");
  // 1/(1 + s/2) at w = 2 rad/s: 1/sqrt(2) at -45 degrees.
  const auto d = analysed(folder, {lag, "--at", "0.3183098861837907"});
  CHECK(at(d["at"]["gain"], 0, 0) == near(std::sqrt(0.5)));
  CHECK(at(d["at"]["phase_rad"], 0, 0) == near(-0.7853981633974483));
  CHECK(analysed(folder, {lag}).contains("at") == false);
  CHECK_THAT(report(folder, {lag, "--at", "0.3183098861837907"}),
             Catch::Contains("0.70711") && Catch::Contains("-45.00"));
}

TEST_CASE("analyse: discretised, with what each method costs", "[tools][command]") {
  const Folder folder;
  const std::string mass =
      folder.write("mass.toml", "[system]\nA = [[0.0, 1.0], [0.0, 0.0]]\nB = [[0.0], [1.0]]\nC = [[1.0, 0.0]]\n");
  const auto all = analysed(folder, {mass, "--period", "0.1"})["discretisation"];
  REQUIRE(all.size() == 3);
  CHECK(all[0]["method"] == "zero_order_hold");
  // Held input on a double integrator: A = [1 T; 0 1], B = [T^2/2; T], by hand.
  CHECK(at(all[0]["A"], 0, 1) == near(0.1));
  CHECK(at(all[0]["B"], 0, 0) == near(0.005));
  CHECK(at(all[0]["B"], 1, 0) == near(0.1));
  CHECK(at(all[1]["B"], 0, 0) == 0.0);  // Euler: B T
  for (const auto& one : all)
    CHECK(one["error_to_tenth_of_nyquist"].get<double>() < one["error_to_half_of_nyquist"].get<double>());
  const Answer twice = folder.run({"analyse", systems + "double_integrator_sampled.toml", "--period", "0.1"});
  CHECK(twice.status == 2);
  CHECK_THAT(twice.err, Catch::Contains("--period") && Catch::Contains("discrete already"));
}

// The circuit's own polynomial: L C s^2 + (R + R_c) C s + 1, L = 2 mH, C = 1 mF, R + R_c = 0.15 ohm.
TEST_CASE("analyse: a descriptor is reduced, and says which variable was redundant", "[tools][command]") {
  const Folder folder;
  const auto d = analysed(folder, {systems + "dc_link_descriptor.toml"});
  CHECK(d["order"] == 2);
  REQUIRE(d["redundant"].size() == 1);
  CHECK(d["redundant"][0]["variable"] == "node_V");
  CHECK(at(d["poles"], 0, 0) == near(-0.15 / 2e-3 / 2.0));
  CHECK(at(d["poles"], 0, 1) == near(std::sqrt(1.0 / (2e-3 * 1e-3) - 37.5 * 37.5)));
  // At rest the node stands at the rectifier's voltage less the load's drop on the choke.
  CHECK(at(d["dc_gain"], 0, 0) == near(1.0));
  CHECK(at(d["dc_gain"], 0, 1) == near(-0.1));
  CHECK_THAT(report(folder, {systems + "dc_link_descriptor.toml"}),
             Catch::Contains("Redundant in the descriptor form: node_V"));
}

TEST_CASE("analyse: a zero in the wrong half plane is told", "[tools][command]") {
  const Folder folder;
  // (s - 2)/((s + 1)(s + 3)) in controllable form.
  const std::string file =
      folder.write("zero.toml", "[system]\nA = [[0.0, 1.0], [-3.0, -4.0]]\nB = [[0.0], [1.0]]\nC = [[-2.0, 1.0]]\n");
  const auto d = analysed(folder, {file});
  REQUIRE(d["zeros"].size() == 1);
  CHECK(at(d["zeros"], 0, 0) == near(2.0));
  CHECK_THAT(report(folder, {file}), Catch::Contains("zero at 2 is not minimum-phase"));
}

TEST_CASE("analyse: systems without states, inputs or outputs", "[tools][command]") {
  const Folder folder;
  const std::string gain = folder.write("gain.toml", "[system]\nA = []\nD = [[3.0, 4.0]]\n");
  const auto d = analysed(folder, {gain, "--figure", folder.file("gain.svg")});
  CHECK(d["order"] == 0);
  CHECK(d["poles"].empty());
  CHECK(d["stability"] == "stable");
  CHECK(at(d["dc_gain"], 0, 1) == 4.0);
  const std::string deaf = folder.write("deaf.toml", "[system]\nA = [[-1.0]]\nB = [[]]\nC = [[1.0]]\n");
  CHECK(analysed(folder, {deaf, "--figure", folder.file("deaf.svg")})["controllable_rank"] == 0);
  const std::string mute = folder.write("mute.toml", "[system]\nA = [[-1.0]]\nB = [[1.0]]\nC = []\n");
  CHECK(analysed(folder, {mute})["observable_rank"] == 0);
}

TEST_CASE("analyse: the picture holds poles, steps, gain and phase", "[tools][command]") {
  const Folder folder;
  for (const char* name : {"two_mass_shaft", "double_integrator_sampled", "hidden_mode", "reactor_two_inputs"}) {
    const std::string figure = folder.file(std::string(name) + ".svg");
    REQUIRE(folder.run({"analyse", systems + name + ".toml", "--figure", figure, "--quiet"}).out.empty());
    const std::string svg = content(figure);
    CHECK(svg.rfind("<?xml", 0) == 0);
    for (const char* part :
         {"poles and zeros", "response to a step", "gain, dB", "phase, degrees", "frequency, Hz", "</svg>"})
      CHECK_THAT(svg, Catch::Contains(part));
    CHECK(svg.find("nan") == std::string::npos);
    CHECK(svg.find("inf") == std::string::npos);
  }
}

TEST_CASE("analyse: numbers beyond sense end in a sentence, never in a fault", "[tools][command]") {
  const Folder folder;
  const std::string tail =
      "B = [[0.0], [1.0]]\nC = [[1.0, 0.0]]\n[design]\nkind = \"lqr\"\nQ = [[1.0, 0.0], [0.0, 1.0]]\nR = [[1.0]]\n";
  int n = 0;
  for (const char* A : {"[[1e100, 1.0], [0.0, -1e-100]]", "[[-1e-6, 1.0], [0.0, -1e9]]", "[[1e6, 1.0], [0.0, -1e-6]]",
                        "[[0.0, 0.0], [0.0, 0.0]]", "[[0.0, 1e100], [-1e100, 0.0]]"}) {
    const std::string file =
        folder.write("odd" + std::to_string(n++) + ".toml", "[system]\nA = " + std::string(A) + "\n" + tail);
    for (const char* verb : {"analyse", "design"}) {
      const Answer answer = folder.run({verb, file, "--figure", folder.file("odd.svg")});
      INFO(verb << " of " << A << ": " << answer.err);
      CHECK((answer.status == 0 || answer.status == 2));
      CHECK(answer.err.find("fault in slipbench") == std::string::npos);
    }
  }
}

TEST_CASE("analyse: refusals", "[tools][command]") {
  const Folder folder;
  const std::string lag = folder.write("lag.toml", "[system]\nA = [[-2.0]]\nB = [[2.0]]\nC = [[1.0]]\n");
  CHECK(folder.run({"analyse", lag, "--at", "0"}).status == 2);
  CHECK(folder.run({"analyse", lag, "--period", "x"}).status == 2);
  CHECK(folder.run({"analyse", lag, "--figure", "x.png"}).status == 2);
  CHECK(folder.run({"analyse", lag, "--figure", folder.file("no/such/x.svg")}).status == 3);
  const Answer broken = folder.run({"analyse", lag, "--set", "system.A=[[-2.0, 1.0]]", "--json"});
  CHECK(broken.status == 2);
  CHECK(broken.json()["error"]["key"] == "system.A");
  CHECK(broken.json()["error"]["place"] == "--set:system.A");
  CHECK(folder.run({"check", lag, "--json"}).json()["kind"] == "state-space file");
}
