// One control tick of each estimator and controller, beside one step of the machine (rk4, double): `machine_steps` is how many
// of those it costs. Inputs are a sinusoidal steady state with the demo machine, so that no path is special.
#include <benchmark/benchmark.h>

#include <array>
#include <ctime>
#include <string>
#include <vector>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "plant/drive.hpp"
#include "plant/steady_state.hpp"
#include "sim/engine/steppers.hpp"
#include "sim/scenario/read.hpp"

namespace {

using namespace slipbench;

constexpr double period = 100e-6;

double now() {
  timespec t{};
  clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
  return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
}

struct Bench {
  MachineSettings machine = read_machine(SLIPBENCH_SOURCE_DIR "/configs/machines/demo_4kw.toml");
  Circuit<double> circuit = machine.circuit();
  SteadyState steady = steady_at_flux(circuit, 0.95, 18.0, 2.0 * 120.0);

  // Voltage and current of tick k.
  [[nodiscard]] std::array<Vec2<double>, 2> at(std::int64_t k) const {
    const SinCos<double> angle = sincos(steady.stator_frequency * period * static_cast<double>(k % 100000));
    return {turn_forward(angle, steady.voltage), turn_forward(angle, steady.current)};
  }
};

// Nanoseconds of one step of the machine with its shaft.
double machine_step_ns(const Bench& b) {
  Drive<double> d;
  d.machine = make_machine(b.circuit);
  d.shaft = {1.0 / 0.03, 0.0, 0.0, 1.0};
  d.supply = Supply::inverter;
  d.inverter_ideal = true;
  DriveInput<double> in;
  in.ideal_voltage = b.steady.voltage;
  DriveState<double> x{};
  const auto system = [&](const DriveState<double>& s, DriveState<double>& dx, double t) {
    dx = drive_derivative(d, in, s, t);
  };
  constexpr int steps = 200000;
  const double begun = now();
  for (int n = 0; n < steps; ++n) odeint_step<Stepper::rk4>(system, x, n * 10e-6, 10e-6);
  benchmark::DoNotOptimize(x);
  return (now() - begun) / steps * 1e9;
}

template <class Tick>
void count(benchmark::State& state, const Bench& b, Tick tick) {
  std::int64_t k = 0;
  const double begun = now();
  for (auto _ : state) tick(k++);
  const double tick_ns = (now() - begun) / static_cast<double>(k) * 1e9;
  state.counters["machine_steps"] = tick_ns / machine_step_ns(b);
}

template <class Method>
void estimator_tick(benchmark::State& state) {
  const Bench b;
  EstimatorSetup setup;
  setup.circuit = b.circuit;
  setup.nameplate = b.machine.nameplate();
  setup.inertia_kgm2 = 0.03;
  setup.current_noise_A = 0.1;
  setup.start_rotor_flux_Wb = 0.95;
  setup.start_speed_rad_s = 120.0;
  const auto constants = Method::prepare(setup, Settings{});
  auto memory = Method::begin(setup, constants);
  count(state, b, [&](std::int64_t k) {
    const auto [u, i] = b.at(k);
    Sample<double> sample;
    sample.tick = k;
    sample.u_alpha = u.x;
    sample.u_beta = u.y;
    sample.i_alpha = i.x;
    sample.i_beta = i.y;
    benchmark::DoNotOptimize(Method::template step<double>(memory, sample, constants));
  });
}

template <class Method>
void controller_tick(benchmark::State& state) {
  const Bench b;
  ControllerSetup setup;
  setup.circuit = b.circuit;
  setup.nameplate = b.machine.nameplate();
  setup.inertia_kgm2 = 0.03;
  setup.inverter = {565.0, 2e-6, 1.0, 10e3, 0.2};
  setup.rotor_flux_reference_Wb = setup.start_rotor_flux_Wb = 0.95;
  const auto constants = Method::prepare(setup, Settings{});
  auto memory = Method::begin(setup, constants);
  count(state, b, [&](std::int64_t k) {
    Measurement<double> m;
    m.current = b.at(k)[1];
    m.dc_link = 565.0;
    m.speed = m.speed_reference = 120.0;
    benchmark::DoNotOptimize(Method::template step<double>(memory, m, constants));
  });
}

}  // namespace

int main(int argc, char** argv) {
  each_estimator_method(
      []<class Method>() { benchmark::RegisterBenchmark(std::string(Method::kind).c_str(), estimator_tick<Method>); });
  each_controller_method(
      []<class Method>() { benchmark::RegisterBenchmark(std::string(Method::kind).c_str(), controller_tick<Method>); });
  benchmark::Initialize(&argc, argv);
  if (benchmark::ReportUnrecognizedArguments(argc, argv)) return 2;
  benchmark::RunSpecifiedBenchmarks();
}
