// Each estimator's step over every number type: lanes give the bits of double, dual the same values and right
// slopes, float stays near, and the C that a symbol writes down gives the bits of float.
#include <dlfcn.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <map>

#include "estimators/methods.hpp"
#include "plant/math/dual.hpp"
#include "plant/math/lanes.hpp"
#include "plant/math/symbol.hpp"
#include "tests/estimators/drive_bench.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

// What an estimator saw of a drive that magnetises, speeds up, takes load and reverses; at the end the
// samples are shaken, so that recovery runs too: every arm of every choice is met.
const std::vector<Sample<double>>& samples_of(const PublishedMachine& machine) {
  static std::map<std::string_view, std::vector<Sample<double>>> known;
  std::vector<Sample<double>>& log = known[machine.name];
  if (!log.empty()) return log;
  std::vector<Rider> recorder{{"recorder", [&](const Sample<double>& s) {
                                 log.push_back(s);
                                 return Estimate<double>{};
                               }}};
  DriveBench bench(machine, 21);
  const double rated = machine.plate.speed_rad_s();
  bench.magnetising_s = 0.1;
  bench.speed_reference = [&](double t) {
    return rated * (t < 0.2 ? 5.0 * t : std::max(-1.0, 1.0 - 10.0 * (t - 0.3)));
  };
  bench.load_torque = [&](double t) { return t > 0.15 ? 0.5 * machine.plate.torque_Nm : 0.0; };
  bench.run(0.6, recorder, [](const Truth&, const std::vector<Estimate<double>>&) {});
  for (std::size_t k = 5000; k < log.size(); k += 3) log[k].i_alpha = -4.0 * log[k].i_beta;
  return log;
}

template <class Number, class From>
std::vector<Number> flat(const From& item) {
  std::vector<Number> out;
  each_number(item, [&](const Number& x) { out.push_back(x); });
  return out;
}
template <class Method, class F>
void each_tick(const PublishedMachine& machine, F&& f) {
  const EstimatorSetup setup = setup_of(machine);
  const auto c = Method::prepare(setup, {});
  auto state = Method::begin(setup, c);
  const auto& log = samples_of(machine);
  for (std::size_t k = 0; k < log.size(); ++k) f(k, log[k], Method::step(state, log[k], c));
}

template <class Method>
void lanes_equal_double() {
  constexpr std::size_t W = 4;
  using Pack = Lanes<Sse2, W>;
  const auto machines = published_machines();
  typename Method::template Constants<Pack> constants;
  typename Method::template State<Pack> state;
  std::array<std::vector<std::vector<double>>, W> alone;
  const auto fill = [](std::size_t lane, const auto& from, auto& to) {
    const auto a = flat<double>(from);
    const auto b = numbers_of<Pack>(to);
    for (std::size_t n = 0; n < a.size(); ++n) b[n]->set(lane, a[n]);
  };
  for (std::size_t lane = 0; lane < W; ++lane) {
    const EstimatorSetup setup = setup_of(machines[lane]);
    const auto c = Method::prepare(setup, {});
    fill(lane, c, constants);
    fill(lane, Method::begin(setup, c), state);
    each_tick<Method>(machines[lane], [&](std::size_t, const Sample<double>&, const Estimate<double>& e) {
      alone[lane].push_back(flat<double>(e));
    });
  }
  for (std::size_t k = 0; k < alone[0].size(); ++k) {
    Sample<Pack> sample;
    for (std::size_t lane = 0; lane < W; ++lane) fill(lane, samples_of(machines[lane])[k], sample);
    const auto packed = flat<Pack>(Method::step(state, sample, constants));
    for (std::size_t lane = 0; lane < W; ++lane) {
      for (std::size_t n = 0; n < packed.size(); ++n) {
        const double one = packed[n].get(lane), other = alone[lane][k][n];
        if (std::memcmp(&one, &other, sizeof one) != 0)
          FAIL(Method::kind << " tick " << k << " lane " << lane << " number " << n);
      }
    }
  }
}

template <class Method>
void float_stays_near() {
  const PublishedMachine machine = krause_3hp();
  const EstimatorSetup setup = setup_of(machine);
  const auto c = Method::prepare(setup, {});
  const auto single = in_number<typename Method::template Constants<float>, float>(c);
  auto state = in_number<typename Method::template State<float>, float>(Method::begin(setup, c));
  double worst = 0.0;
  each_tick<Method>(machine, [&](std::size_t k, const Sample<double>& s, const Estimate<double>& e) {
    const Estimate<float> got = Method::step(state, in_number<Sample<float>, float>(s), single);
    if (k > 1000 && k < 5000) worst = std::max(worst, std::fabs(double(got.speed) - e.speed));
  });
  INFO(Method::kind << ": worst difference " << worst << " rad/s");
  // 6e-8 of a turn of flux over a period of 100 us is 2e-3 rad/s a tick, filtered: well below 0.1 % of 179
  // rad/s.
  CHECK(worst < 0.1);
}

// Slope of the speed estimate along the measured current, against a central difference.
template <class Method>
void dual_carries_slopes() {
  using D = Dual<double, 1>;
  const PublishedMachine machine = barut_3kW();
  const EstimatorSetup setup = setup_of(machine);
  const auto c = Method::prepare(setup, {});
  auto state = Method::begin(setup, c);
  const auto& log = samples_of(machine);
  constexpr std::size_t at = 2900;
  for (std::size_t k = 0; k < at; ++k) Method::step(state, log[k], c);
  auto dual_state = in_number<typename Method::template State<D>, D>(state);
  auto sample = in_number<Sample<D>, D>(log[at]);
  sample.i_alpha = D::variable(log[at].i_alpha, 0);
  const auto got = Method::step(dual_state, sample, in_number<typename Method::template Constants<D>, D>(c));
  const auto value_at = [&](double shift) {
    auto s = state;
    auto moved = log[at];
    moved.i_alpha += shift;
    return flat<double>(Method::step(s, moved, c));
  };
  const double h = 1e-4;
  const auto here = value_at(0.0), up = value_at(h), down = value_at(-h);
  const auto dual = flat<D>(got);
  for (std::size_t n = 0; n < dual.size(); ++n) {
    INFO(Method::kind << " number " << n);
    CHECK(dual[n].value == here[n]);
    // h^2 curvature, and rounding of 1e-16 of the value over h.
    CHECK(dual[n].slope[0] ==
          Approx((up[n] - down[n]) / (2.0 * h)).epsilon(1e-5).margin(1e-9 * (1.0 + std::fabs(here[n]))));
  }
}

template <class Method>
void emitted_c_equals_float() {
  using S = Symbol<float>;
  const PublishedMachine machine = hinkkanen_2kW();
  const EstimatorSetup setup = setup_of(machine);
  const auto c = Method::prepare(setup, {});
  Program<float> program;
  typename Method::template State<S> symbols;
  Sample<S> sample;
  program.inputs(symbols, "state");
  program.inputs(sample, "in");
  const Estimate<S> out = Method::step(symbols, sample, in_number<typename Method::template Constants<S>, S>(c));
  program.outputs(symbols, "state");
  program.outputs(out, "out");
  std::size_t operations = 0;
  for (const auto& [op, count] : program.operation_counts())
    operations += op == SymbolOp::constant || op == SymbolOp::input ? 0 : count;
  INFO(Method::kind << ": " << operations << " operations");
  CHECK(operations < 2500);  // a small controller board does some 1e8 a second: 25 us of the 100 us period

  const auto folder =
      std::filesystem::temp_directory_path() / ("slipbench_" + std::string(Method::kind) + std::to_string(::getpid()));
  std::filesystem::create_directories(folder);
  std::ofstream(folder / "step.c") << program.emit_c("estimator_step");
  const std::string library = (folder / "step.so").string();
  const std::string build = "cc -std=c99 -O2 -ffp-contract=off -fno-math-errno -shared -fPIC -o " + library + " " +
                            (folder / "step.c").string() + " -lm";
  REQUIRE(std::system(build.c_str()) == 0);
  void* handle = ::dlopen(library.c_str(), RTLD_NOW);
  REQUIRE(handle != nullptr);
  const auto emitted = reinterpret_cast<void (*)(float*, const float*, float*)>(::dlsym(handle, "estimator_step"));
  REQUIRE(emitted != nullptr);
  auto state = in_number<typename Method::template State<float>, float>(Method::begin(setup, c));
  const auto single = in_number<typename Method::template Constants<float>, float>(c);
  auto emitted_state = flat<float>(state);
  const auto& log = samples_of(machine);
  for (std::size_t k = 0; k < log.size(); ++k) {
    const auto in = in_number<Sample<float>, float>(log[k]);
    const auto expected = flat<float>(Method::step(state, in, single));
    std::vector<float> got(expected.size());
    emitted(emitted_state.data(), flat<float>(in).data(), got.data());
    if (std::memcmp(got.data(), expected.data(), got.size() * sizeof(float)) != 0) FAIL(Method::kind << " tick " << k);
  }
  ::dlclose(handle);
  std::filesystem::remove_all(folder);
}

}  // namespace

TEST_CASE("estimators: lanes give the bits of double", "[estimators][number_types]") {
  each_estimator_method([]<class Method>() { lanes_equal_double<Method>(); });
}
TEST_CASE("estimators: float stays near double", "[estimators][number_types]") {
  each_estimator_method([]<class Method>() { float_stays_near<Method>(); });
}
TEST_CASE("estimators: dual numbers carry slopes", "[estimators][number_types]") {
  each_estimator_method([]<class Method>() { dual_carries_slopes<Method>(); });
}
TEST_CASE("estimators: emitted C gives the bits of float", "[estimators][number_types]") {
  each_estimator_method([]<class Method>() { emitted_c_equals_float<Method>(); });
}
