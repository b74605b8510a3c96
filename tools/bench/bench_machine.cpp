// The machine's RK4 step per number type against a bare hand-written loop in double; packs per instruction set, with the
// time of one lane as the rate. What the processor lacks is reported as skipped.
#include <benchmark/benchmark.h>

#include <array>
#include <string>
#include <vector>

#include "plant/math/dual.hpp"
#include "plant/math/elementary.hpp"
#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/lanes/machine_step.hpp"
#include "sim/engine/steppers.hpp"

namespace slipbench {
namespace {

constexpr double h = 1e-5;

// Invented, of the size of a 4 kW machine.
MachineOnVoltage<double> machine() {
  return {make_machine(Circuit<double>{2.0, 1.4, 1.3, 0.006, 0.008, 0.17}), 1.0 / 0.013, 12.0, {310.0, 20.0}};
}
constexpr MachineState<double> start{0.7, -0.6, 0.5, -0.8, 130.0};

// What a programmer would write for this one machine and nothing else.
struct Bare {
  double p, R_s, R_r, per_Ls, per_Lr, per_Lm, k, per_J, T_load, u_a, u_b;
  void rates(const double* x, double* d) const {
    const double i_a = per_Ls * x[0] - per_Lm * x[2], i_b = per_Ls * x[1] - per_Lm * x[3];
    const double w = p * x[4];
    d[0] = u_a - R_s * i_a;
    d[1] = u_b - R_s * i_b;
    d[2] = -w * x[3] - R_r * (per_Lr * x[2] - per_Lm * x[0]);
    d[3] = w * x[2] - R_r * (per_Lr * x[3] - per_Lm * x[1]);
    d[4] = per_J * (k * (x[0] * i_b - x[1] * i_a) - T_load);
  }
  void step(double* x) const {
    double a[5], b[5], c[5], d[5], y[5];
    rates(x, a);
    for (int i = 0; i < 5; ++i) y[i] = x[i] + 0.5 * h * a[i];
    rates(y, b);
    for (int i = 0; i < 5; ++i) y[i] = x[i] + 0.5 * h * b[i];
    rates(y, c);
    for (int i = 0; i < 5; ++i) y[i] = x[i] + h * c[i];
    rates(y, d);
    for (int i = 0; i < 5; ++i) x[i] += h / 6.0 * (a[i] + 2.0 * b[i] + 2.0 * c[i] + d[i]);
  }
};

void bare_loop(benchmark::State& state) {
  const auto m = machine();
  Bare bare{m.machine.pole_pairs,    m.machine.R_s, m.machine.R_r, m.machine.per_Ls, m.machine.per_Lr, m.machine.per_Lm,
            m.machine.torque_factor, m.per_inertia, m.load_torque, m.voltage.x,      m.voltage.y};
  benchmark::DoNotOptimize(bare);
  auto x = start;
  for (auto _ : state) {
    bare.step(x.data());
    benchmark::DoNotOptimize(x);
  }
}
BENCHMARK(bare_loop);

template <class Real, Stepper method>
void step_of(benchmark::State& state) {
  auto m = in_number<MachineOnVoltage<Real>, Real>(machine());
  benchmark::DoNotOptimize(m);
  MachineState<Real> x;
  for (std::size_t i = 0; i < x.size(); ++i) x[i] = Real(start[i]);
  for (auto _ : state) {
    odeint_step<method>(m, x, 0.0, h);
    benchmark::DoNotOptimize(x);
  }
}
BENCHMARK(step_of<double, Stepper::rk4>)->Name("double/rk4");
BENCHMARK(step_of<double, Stepper::euler>)->Name("double/euler");
BENCHMARK(step_of<double, Stepper::midpoint>)->Name("double/midpoint");
BENCHMARK(step_of<double, Stepper::cash_karp5>)->Name("double/cash_karp5");
BENCHMARK(step_of<float, Stepper::rk4>)->Name("float/rk4");
BENCHMARK(step_of<Dual<double, 5>, Stepper::rk4>)->Name("dual5/rk4");

// One iteration is one step of a pack; the counter ns_a_lane is the figure to compare with double.
void lanes(benchmark::State& state, const LaneSet& set) {
  if (!set.available()) return state.SkipWithError("this processor lacks the instruction set");
  const std::size_t width = set.width();
  std::vector<double> constants, states;
  auto m = machine();
  each_number(m, [&](double& x) {
    for (std::size_t c = 0; c < width; ++c) constants.push_back(x * (1.0 + 0.01 * static_cast<double>(c)));
  });
  for (double x : start) states.insert(states.end(), width, x);
  LanesJob job;
  job.work = LanesWork::machine_steps;
  job.cases = width, job.steps = 1000, job.step_s = h;
  job.constants = constants.data(), job.states = states.data();
  while (state.KeepRunningBatch(job.steps)) {
    set.run(&job);
    benchmark::ClobberMemory();
  }
  state.counters["lanes"] = static_cast<double>(width);
  state.counters["s_a_lane"] = benchmark::Counter(static_cast<double>(state.iterations()) * static_cast<double>(width),
                                                  benchmark::Counter::kIsRate | benchmark::Counter::kInvert);
}
const bool lanes_registered = [] {
  for (const auto& set : lane_sets()) {
    benchmark::RegisterBenchmark(("lanes/" + std::string(set.name) + "/rk4").c_str(),
                                 [&set](benchmark::State& s) { lanes(s, set); });
  }
  return true;
}();

// The elementary functions, each call waiting for the one before, as in a tick.
template <class F>
void chain(benchmark::State& state, F f) {
  double x = 0.37;
  for (auto _ : state) {
    x = 0.5 + 0.1 * f(x);
    benchmark::DoNotOptimize(x);
  }
}
BENCHMARK_CAPTURE(chain, sincos, [](double x) {
  const auto s = slipbench::sincos(x);
  return s.sin * s.cos;
});
BENCHMARK_CAPTURE(chain, sincos_turns, [](double x) {
  const auto s = slipbench::sincos_turns(x);
  return s.sin * s.cos;
});
BENCHMARK_CAPTURE(chain, atan2, [](double x) { return slipbench::atan2(x, 1.0 - x); });
BENCHMARK_CAPTURE(chain, exp, [](double x) { return slipbench::exp(-x); });
BENCHMARK_CAPTURE(chain, log, [](double x) { return slipbench::log(x); });

}  // namespace
}  // namespace slipbench

BENCHMARK_MAIN();
