// Every controller's step over every number type: float near double, lanes the same bits, dual the same values, and the
// C that a symbol writes down the same bits as float.
#include <dlfcn.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <vector>

#include "plant/math/dual.hpp"
#include "plant/math/lanes.hpp"
#include "plant/math/symbol.hpp"
#include "tests/controllers/closed_loop.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

struct Log {
  ControllerSetup setup;
  std::vector<Measurement<double>> measured;
  std::vector<Command<double>> command;
};

// Magnetising, a step beyond rated speed, a load: every arm of every choice is met.
template <class Method>
Log drive_log(const PublishedMachine& truth, Modulation kind, int delay) {
  Log log;
  log.setup = setup_for(truth);
  log.setup.modulation = kind;
  log.setup.delay_periods = delay;
  log.setup.inverter.dead_time_s = 2e-6;
  log.setup.inverter.device_drop_V = 1.0;
  ClosedLoopOf<Method> loop(truth, log.setup);
  loop.leg = leg_error(2e-6, 10e3, 1.0, log.setup.inverter.zero_current_width_A);
  for (int k = 0; k < 6000; ++k) {
    loop.measured.speed_reference = k < 2000 ? 0.0 : 1.5 * truth.nameplate.speed_rad_s();
    loop.load_torque = k < 4500 ? 0.0 : 0.4 * truth.nameplate.torque_Nm;
    loop.step();
    log.measured.push_back(loop.measured);
    log.command.push_back(loop.command);
  }
  return log;
}

bool same_bits(double a, double b) { return std::memcmp(&a, &b, sizeof a) == 0; }

}  // namespace

TEST_CASE("number types: lanes give the bits of double", "[controllers][number_types]") {
  each_controller_method([]<class Method>() {
    INFO(Method::kind);
    constexpr std::size_t W = 4;
    using Pack = Lanes<Sse2, W>;
    const std::array<PublishedMachine, W> machines = published_machines();
    const Modulation kinds[W] = {Modulation::space_vector, Modulation::sine, Modulation::discontinuous,
                                 Modulation::space_vector};
    std::array<Log, W> logs;
    typename Method::template Constants<Pack> constants;
    typename Method::template State<Pack> state;
    for (std::size_t lane = 0; lane < W; ++lane) {
      logs[lane] = drive_log<Method>(machines[lane], kinds[lane], lane < 2 ? 1 : lane == 2 ? 0 : 2);
      auto c = Method::prepare(logs[lane].setup, {});
      auto s = Method::begin(logs[lane].setup, c);
      const auto fill = [lane](auto& from, auto& to) {
        const auto a = numbers_of<double>(from);
        const auto b = numbers_of<Pack>(to);
        for (std::size_t i = 0; i < a.size(); ++i) b[i]->set(lane, *a[i]);
      };
      fill(c, constants);
      fill(s, state);
    }
    for (std::size_t k = 0; k < logs[0].measured.size(); ++k) {
      Measurement<Pack> m;
      const auto to = numbers_of<Pack>(m);
      for (std::size_t lane = 0; lane < W; ++lane) {
        const auto from = numbers_of<const double>(logs[lane].measured[k]);
        for (std::size_t i = 0; i < from.size(); ++i) to[i]->set(lane, *from[i]);
      }
      const Command<Pack> got = Method::step(state, m, constants);
      const auto packed = numbers_of<const Pack>(got);
      for (std::size_t lane = 0; lane < W; ++lane) {
        const auto alone = numbers_of<const double>(logs[lane].command[k]);
        for (std::size_t i = 0; i < alone.size(); ++i) {
          if (!same_bits(packed[i]->get(lane), *alone[i])) FAIL("tick " << k << ", lane " << lane << ", number " << i);
        }
      }
    }
  });
}

// Single precision fed the same measurements: rounding of 6e-8 in angle, flux and integrals; the integrals' own
// rounding gathers over the speed loop's 26 ms: 2e-3 of full duty is far below a dead time's 2e-2.
TEST_CASE("number types: float stays near double", "[controllers][number_types]") {
  each_controller_method([]<class Method>() {
    INFO(Method::kind);
    const Log log = drive_log<Method>(krause_3hp(), Modulation::space_vector, 1);
    const auto c = Method::prepare(log.setup, {});
    const auto single = in_number<typename Method::template Constants<float>, float>(c);
    auto state = in_number<typename Method::template State<float>, float>(Method::begin(log.setup, c));
    double worst = 0.0;
    for (std::size_t k = 0; k < log.measured.size(); ++k) {
      const auto m = in_number<Measurement<float>, float>(log.measured[k]);
      const Command<float> got = Method::step(state, m, single);
      worst = max(worst, std::fabs(static_cast<double>(got.duty.a) - log.command[k].duty.a));
    }
    INFO("worst duty difference " << worst);
    CHECK(worst < 2e-3);
  });
}

// Values as in double; the slope of the duty along the measured current against a central difference, away from the
// corners of any choice.
TEST_CASE("number types: dual carries the controller's slopes", "[controllers][number_types]") {
  each_controller_method([]<class Method>() {
    INFO(Method::kind);
    using D = Dual<double, 1>;
    const Log log = drive_log<Method>(krause_3hp(), Modulation::space_vector, 1);
    const auto c = Method::prepare(log.setup, {});
    auto state = Method::begin(log.setup, c);
    const std::size_t at = 5900;
    for (std::size_t k = 0; k < at; ++k) Method::step(state, log.measured[k], c);
    auto dual_state = in_number<typename Method::template State<D>, D>(state);
    auto m = in_number<Measurement<D>, D>(log.measured[at]);
    m.current.x = D::variable(log.measured[at].current.x, 0);
    const Command<D> got = Method::step(dual_state, m, in_number<typename Method::template Constants<D>, D>(c));
    CHECK(got.duty.a.value == log.command[at].duty.a);
    const double h = 1e-4;
    const auto duty_at = [&](double shift) {
      auto s = state;
      auto moved = log.measured[at];
      moved.current.x += shift;
      return Method::step(s, moved, c).duty.a;
    };
    const double slope = (duty_at(h) - duty_at(-h)) / (2.0 * h);
    CHECK(std::fabs(slope) > 1e-3);
    CHECK(got.duty.a.slope[0] == Approx(slope).epsilon(1e-5));  // h^2 curvature and 1e-16 / h rounding
  });
}

TEST_CASE("number types: emitted C gives the bits of float", "[controllers][number_types]") {
  each_controller_method([]<class Method>() {
    INFO(Method::kind);
    const Log log = drive_log<Method>(barut_3kW(), Modulation::discontinuous, 1);
    const auto c = Method::prepare(log.setup, {});
    using S = Symbol<float>;
    Program<float> program;
    typename Method::template State<S> symbols;
    Measurement<S> measured;
    program.inputs(symbols, "state");
    program.inputs(measured, "in");
    const Command<S> out = Method::step(symbols, measured, in_number<typename Method::template Constants<S>, S>(c));
    program.outputs(symbols, "state");
    program.outputs(out, "out");

    const auto folder = std::filesystem::temp_directory_path() / ("slipbench_control_" + std::to_string(::getpid()));
    std::filesystem::create_directories(folder);
    std::ofstream(folder / "step.c") << program.emit_c("control_step");
    const std::string library = (folder / "step.so").string();
    const std::string build = "cc -std=c99 -O2 -ffp-contract=off -fno-math-errno -shared -fPIC -o " + library + " " +
                              (folder / "step.c").string() + " -lm";
    REQUIRE(std::system(build.c_str()) == 0);
    void* handle = ::dlopen(library.c_str(), RTLD_NOW);
    REQUIRE(handle != nullptr);
    const auto emitted = reinterpret_cast<void (*)(float*, const float*, float*)>(::dlsym(handle, "control_step"));
    REQUIRE(emitted != nullptr);

    auto state = in_number<typename Method::template State<float>, float>(Method::begin(log.setup, c));
    const auto single = in_number<typename Method::template Constants<float>, float>(c);
    std::vector<float> emitted_state;
    each_number(state, [&](float& x) { emitted_state.push_back(x); });
    for (std::size_t k = 0; k < log.measured.size(); ++k) {
      const auto m = in_number<Measurement<float>, float>(log.measured[k]);
      const Command<float> expected = Method::step(state, m, single);
      std::vector<float> in, got(numbers_of<const float>(expected).size());
      each_number(m, [&](const float& x) { in.push_back(x); });
      emitted(emitted_state.data(), in.data(), got.data());
      std::size_t i = 0;
      each_number(expected, [&](const float& x) {
        if (std::memcmp(&x, &got[i], sizeof x) != 0) FAIL("tick " << k << ", output " << i);
        ++i;
      });
    }
    ::dlclose(handle);
    std::filesystem::remove_all(folder);
  });
}
