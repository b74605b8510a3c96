// Whole runs: a mains start beside a bare loop over the same equations, and a sensorless drive beside real time.
//
// Each counter is a ratio of figures of this same process: `of_bare` is the run's time over the bare loop's, measured in turns;
// `times_real_time` is simulated seconds in a second of one core, median; `best` of all
// rounds. Times are processor time.
#include <benchmark/benchmark.h>

#include <algorithm>
#include <ctime>
#include <functional>
#include <vector>

#include "plant/drive.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/scenario/read.hpp"

namespace {

using namespace slipbench;

constexpr double duration = 1.0, step = 10e-6;

Scenario mains_start() {
  return read_scenario_text(R"(
[run]
duration_s = 1.0
plant_step_s = 10e-6
control_period_s = 100e-6
trace_period_s = 1e-3
[machine]
file = "krause_3hp.toml"
[shaft]
inertia_kgm2 = 0.089
[[load]]
kind = "fan"
rated_torque_Nm = 12.0
rated_speed_rpm = 1710.0
[supply]
kind = "mains"
line_voltage_V = 220.0
frequency_Hz = 60.0
)",
                            "bench", SLIPBENCH_SOURCE_DIR "/configs/machines");
}

// Nothing but Runge and Kutta: the same supply with its sine and cosine, the same machine, shaft and fan, by hand.
[[gnu::noinline]] double bare_loop(const Drive<double>& d) {
  const Machine<double>& m = d.machine;
  const auto f = [&](const double* x, double* dx, double t) {
    const SinCos<double> angle = sincos_turns(d.mains.frequency * t + d.mains.phase_turns);
    const double i_a = m.per_Ls * x[0] - m.per_Lm * x[2], i_b = m.per_Ls * x[1] - m.per_Lm * x[3];
    const double r_a = m.per_Lr * x[2] - m.per_Lm * x[0], r_b = m.per_Lr * x[3] - m.per_Lm * x[1],
                 w = m.pole_pairs * x[4];
    dx[0] = d.mains.peak * angle.cos - m.R_s * i_a;
    dx[1] = d.mains.peak * angle.sin - m.R_s * i_b;
    dx[2] = -m.R_r * r_a - w * x[3];
    dx[3] = -m.R_r * r_b + w * x[2];
    dx[4] = (m.torque_factor * (x[0] * i_b - x[1] * i_a) - d.load.fan * x[4] * std::fabs(x[4])) * d.shaft.per_inertia;
    dx[5] = x[4];
  };
  double x[6] = {}, k1[6], k2[6], k3[6], k4[6], y[6];
  const auto steps = static_cast<std::int64_t>(duration / step + 0.5);
  for (std::int64_t n = 0; n < steps; ++n) {
    const double t = static_cast<double>(n) * step, half = 0.5 * step;
    f(x, k1, t);
    for (int i = 0; i < 6; ++i) y[i] = x[i] + half * k1[i];
    f(y, k2, t + half);
    for (int i = 0; i < 6; ++i) y[i] = x[i] + half * k2[i];
    f(y, k3, t + half);
    for (int i = 0; i < 6; ++i) y[i] = x[i] + step * k3[i];
    f(y, k4, t + step);
    for (int i = 0; i < 6; ++i) x[i] += step / 6.0 * (k1[i] + 2.0 * k2[i] + 2.0 * k3[i] + k4[i]);
  }
  return x[4];
}

// Seconds of this thread's processor time, so that other work on the machine takes no part.
double seconds(const std::function<void()>& work) {
  const auto now = [] {
    timespec t{};
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
    return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
  };
  const double begun = now();
  work();
  return now() - begun;
}

double median(std::vector<double> all) {
  std::nth_element(all.begin(), all.begin() + static_cast<std::ptrdiff_t>(all.size() / 2), all.end());
  return all[all.size() / 2];
}

void mains_run(benchmark::State& state) {
  const Scenario s = mains_start();
  Drive<double> d;
  d.machine = make_machine(s.machine.circuit());
  d.shaft.per_inertia = 1.0 / s.shaft.inertia_kgm2;
  d.load.fan = 12.0 / square(1710.0 * 3.14159265358979323846 / 30.0);
  d.mains = make_mains(220.0, 60.0, 0.0);
  std::vector<double> bare, run;
  for (auto _ : state) {
    bare.push_back(seconds([&] { benchmark::DoNotOptimize(bare_loop(d)); }));
    run.push_back(seconds([&] { simulate(s, {}); }));
  }
  state.counters["of_bare"] = median(run) / median(bare);
  state.counters["bare_step_ns"] = median(bare) * step / duration * 1e9;
  state.counters["run_step_ns"] = median(run) * step / duration * 1e9;
}
BENCHMARK(mains_run)->Unit(benchmark::kMillisecond)->Iterations(25);

// Sensorless rotor-flux-oriented control, dead time, noise and 12-bit converters, three estimators, plant step 10 us.
constexpr const char* drive = R"(
[run]
duration_s = 2.0
plant_step_s = 10e-6
control_period_s = 100e-6
trace_period_s = 1e-3
start = "magnetised"
[machine]
file = "demo_4kw.toml"
[shaft]
inertia_kgm2 = 0.03
[[load]]
kind = "profile"
torque_Nm = [[0.0, 0.0], [1.2, 0.0], [1.2, 18.0]]
[supply]
kind = "inverter"
dc_link_V = 560.0
switching_frequency_Hz = 10e3
dead_time_s = 2e-6
device_drop_V = 1.0
[sensors.current]
noise_A = 0.11
bits = 12
range_A = 30.0
[sensors.dc_link]
noise_V = 0.5
[reference]
speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.9, 1200.0]]
[controller]
kind = "rotor_flux_oriented"
speed_from = "full"
[[estimator]]
name = "full"
kind = "luenberger"
[[estimator]]
name = "reduced"
kind = "reduced_order"
[[estimator]]
name = "kalman"
kind = "extended_kalman"
)";

void sensorless_drive(benchmark::State& state) {
  const Scenario s = read_scenario_text(drive, "bench", SLIPBENCH_SOURCE_DIR "/configs/machines");
  std::vector<double> wall;
  for (auto _ : state) wall.push_back(seconds([&] { simulate(s, {}); }));
  state.counters["times_real_time"] = s.run.duration_s / median(wall);
  state.counters["best"] = s.run.duration_s / *std::min_element(wall.begin(), wall.end());
}
BENCHMARK(sensorless_drive)->Unit(benchmark::kMillisecond)->Iterations(25);

}  // namespace

BENCHMARK_MAIN();
