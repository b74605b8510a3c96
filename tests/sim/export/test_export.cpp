// Exported C against the run it came from: every built-in method, compiled, loaded and fed with what the simulated one saw over
// a whole closed loop, in float and in double. Every answer to the bit: the exported step is the one that ran.
#include <dlfcn.h>

#include <bit>
#include <catch2/catch.hpp>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <set>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/export/exported.hpp"
#include "sim/export/recorded_step.hpp"
#include "sim/export/traffic.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/scenario/read.hpp"

namespace slipbench {
namespace {

namespace fs = std::filesystem;

const std::string scenarios = SLIPBENCH_SOURCE_DIR "/configs/scenarios/";

// A shipped scenario for each kind of controller, all estimators that it has the sensors for riding along; `seconds` long. A
// controller with a linear observer besides.
std::vector<Scenario> closed_loops(const std::string& seconds) {
  std::vector<Scenario> all = {
      read_scenario(scenarios + "current_loop_observer.toml", {{"run.duration_s", seconds}}, {})};
  each_controller_method([&]<class Method>() {
    for (const auto& file : fs::directory_iterator(scenarios)) {
      if (file.path().extension() != ".toml") continue;
      const Scenario as_shipped = read_scenario(file.path().string(), {}, {});
      if (as_shipped.controller.kind != Method::kind || as_shipped.run.start == "steady") continue;
      std::vector<Override> changes = {{"run.duration_s", seconds}};
      std::size_t i = 0;
      each_estimator_method([&]<class Estimator>() {
        if (requires { Estimator::needs_speed; } && as_shipped.sensors.speed.kind == "none") return;
        const std::string at = "estimator." + std::to_string(as_shipped.estimators.size() + i++);
        changes.push_back({at + ".name", "added_" + std::to_string(i)});
        changes.push_back({at + ".kind", std::string(Estimator::kind)});
      });
      all.push_back(read_scenario(file.path().string(), changes, {}));
      return;
    }
    FAIL("no shipped scenario has the controller " << Method::kind);
  });
  return all;
}

class Loaded {
 public:
  Loaded(const ExportedPart& part, const std::string& flags)
      : folder_(fs::temp_directory_path() / ("slipbench_export_" + std::to_string(::getpid()) + "_" + part.name)) {
    fs::create_directories(folder_);
    for (const ExportedFile& file : part.files) std::ofstream(folder_ / file.name) << file.text;
    const std::string object = (folder_ / "step.so").string();
    const std::string build =
        "cc -std=c99 " + flags +
        " -ffp-contract=off -fno-math-errno -Wall -Wextra -Wconversion -Wdouble-promotion -pedantic "
        "-Werror -shared -fPIC -nostdlib -Wl,-z,defs -o " +
        object + " " + (folder_ / (part.name + ".c")).string();
    REQUIRE(std::system(build.c_str()) == 0);
    handle_ = ::dlopen(object.c_str(), RTLD_NOW | RTLD_LOCAL);
    INFO((handle_ == nullptr ? ::dlerror() : ""));
    REQUIRE(handle_ != nullptr);
  }
  ~Loaded() {
    if (handle_ != nullptr) ::dlclose(handle_);
    fs::remove_all(folder_);
  }
  Loaded(const Loaded&) = delete;
  Loaded& operator=(const Loaded&) = delete;
  template <class F>
  F* function(const std::string& name) const {
    void* address = ::dlsym(handle_, name.c_str());
    REQUIRE(address != nullptr);
    return reinterpret_cast<F*>(address);
  }

 private:
  fs::path folder_;
  void* handle_ = nullptr;
};

// How many ticks differ. The C structs hold numbers of one type and nothing else: arrays by another name.
template <class S>
std::size_t different_ticks(const ExportedPart& part, const DoorTraffic& traffic, const std::string& flags) {
  using Bits = std::conditional_t<sizeof(S) == 8, std::uint64_t, std::uint32_t>;
  const Loaded c(part, flags);
  auto* init = c.template function<void(S*)>(part.name + "_init");
  auto* step = c.template function<void(S*, const S*, S*)>(part.name + "_step");
  std::vector<S> state(part.state_numbers + 1, S(7)), seen(traffic.in_width), got(traffic.out_width, S(0));
  init(state.data());
  std::size_t different = 0;
  for (std::size_t k = 0; k < traffic.ticks(); ++k) {
    for (std::size_t i = 0; i < seen.size(); ++i) seen[i] = static_cast<S>(traffic.seen(k)[i]);
    step(state.data(), seen.data(), got.data());
    bool same = true;
    for (std::size_t i = 0; i < got.size(); ++i)
      same = same && std::bit_cast<Bits>(got[i]) == std::bit_cast<Bits>(static_cast<S>(traffic.answered(k)[i]));
    different += !same;
  }
  CHECK(state.back() == S(7));  // the state is as long as was said
  return different;
}

template <class S>
void exported_equals_run(const std::string& seconds, const std::string& flags) {
  std::set<std::string> kinds;
  for (Scenario s : closed_loops(seconds)) {
    const bool single = sizeof(S) == 4;
    for (EstimatorSettings& e : s.estimators) e.precision = single ? "float" : "double";
    s.controller.precision = single ? "float" : "double";
    Traffic traffic;
    RunObserver* const observers[] = {&traffic};
    REQUIRE_FALSE(simulate(s, observers).diverged);
    ExportRequest request{"test", {}, false, single ? Precision::single : Precision::twofold};
    for (const ExportedPart& part : export_parts(s, request)) {
      INFO(s.path << ": " << part.name << ", " << part.kind);
      kinds.insert(part.kind);
      std::size_t at = 0;
      while (!part.is_controller && s.estimators[at].name != part.name) ++at;
      const DoorTraffic& door = part.is_controller ? traffic.controller : traffic.estimators[at];
      CHECK(door.ticks() == static_cast<std::size_t>(std::llround(s.run.duration_s / s.run.control_period_s)) + 1);
      CHECK(different_ticks<S>(part, door, flags) == 0);
    }
  }
  each_estimator_method([&]<class Method>() { CHECK(kinds.contains(std::string(Method::kind))); });
  each_controller_method([&]<class Method>() { CHECK(kinds.contains(std::string(Method::kind))); });
}

}  // namespace

TEST_CASE("export: float C answers as the float run did, bit for bit", "[sim][export][bits]") {
  exported_equals_run<float>("1.0", "-O2");
}
TEST_CASE("export: double C answers as the double run did, bit for bit", "[sim][export][bits]") {
  exported_equals_run<double>("1.0", "-O1");
}
// 1e5 ticks of 100 us.
TEST_CASE("export: float C answers as the float run did over 1e5 ticks", "[sim][export][bits][long]") {
  exported_equals_run<float>("10.0", "-O2");
}
TEST_CASE("export: double C answers as the double run did over 1e5 ticks", "[sim][export][bits][long]") {
  exported_equals_run<double>("10.0", "-O2");
}

TEST_CASE("export: the float run differs from the double one, by little", "[sim][export]") {
  const std::string file = scenarios + "conveyor_hot_rotor.toml";
  const auto speeds = [&](const std::string& precision) {
    const Scenario s = read_scenario(file, {{"run.duration_s", "1.5"}, {"estimator.2.precision", precision}}, {});
    Traffic traffic;
    RunObserver* const observers[] = {&traffic};
    simulate(s, observers);
    std::vector<double> all;
    for (std::size_t k = 0; k < traffic.estimators[2].ticks(); ++k) all.push_back(traffic.estimators[2].answered(k)[0]);
    return all;
  };
  const std::vector<double> single = speeds("float"), twofold = speeds("double");
  double worst = 0.0;
  std::size_t rounded = 0;
  for (std::size_t k = 0; k < single.size(); ++k) {
    worst = std::max(worst, std::fabs(single[k] - twofold[k]));
    rounded += static_cast<double>(static_cast<float>(single[k])) == single[k];
  }
  CHECK(rounded == single.size());  // every answer is a float
  CHECK(worst > 0.0);
  // Of 157 rad/s synchronous: rounding of 1e-7 a step, through a covariance of condition 1e7 at worst, stays below a percent.
  CHECK(worst < 1.57);
}

TEST_CASE("export: numbers of a state that never change, are equal or unread are no members", "[sim][export]") {
  const Scenario s =
      read_scenario(scenarios + "conveyor_hot_rotor.toml", {{"run.duration_s", "0.01"}, {"score.from_s", "0.0"}}, {});
  const auto parts = export_parts(s, {"test", {"ekf"}, true, Precision::single});
  REQUIRE(parts.size() == 2);
  CHECK(parts[1].name == "ekf");
  // 6 states, 36 entries of a symmetric matrix, two more: at most one triangle is kept.
  CHECK(parts[1].state_numbers <= 6 + 21 + 2);
  CHECK(parts[1].files[0].text.find("P_entry10") == std::string::npos);
  // A delay of one period: of the three commands kept, the eldest is read by nobody.
  CHECK(parts[0].files[0].text.find("commanded2") == std::string::npos);
  CHECK(parts[0].files[0].text.find("commanded1") != std::string::npos);
}

TEST_CASE("export: what is not there, diverges or is not built in is refused", "[sim][export][edge]") {
  const std::string file = scenarios + "conveyor_hot_rotor.toml";
  const Scenario s = read_scenario(file, {{"run.duration_s", "0.01"}, {"score.from_s", "0.0"}}, {});
  CHECK_THROWS_WITH(export_parts(s, {"test", {"kalman"}, false, Precision::single}),
                    Catch::Contains("no estimator is named 'kalman'; there are: luenberger, reduced, ekf"));
  const Scenario mains =
      read_scenario(scenarios + "mains_start.toml", {{"run.duration_s", "0.01"}, {"score.from_s", "0.0"}}, {});
  CHECK_THROWS_AS(export_parts(mains, {"test", {}, true, Precision::single}), InputError);
  const Scenario kicked = read_scenario(
      file, {{"run.duration_s", "0.5"}, {"score.from_s", "0.0"}, {"process_noise.flux_Wb", "1000.0"}}, {});
  CHECK_THROWS_AS(export_parts(kicked, {"test", {}, false, Precision::single}), UnfitForExport);
}

}  // namespace slipbench
