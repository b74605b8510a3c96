// Lanes against double, bit for bit, on each instruction set of this build that the processor has. A set it lacks is a
// visible skip (ctest counts it by the warning's text).
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <random>
#include <string>
#include <vector>

#include "plant/math/elementary.hpp"
#include "plant/math/lanes.hpp"
#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/steppers.hpp"
#include "tests/plant/bits.hpp"
#include "tests/plant/machines.hpp"

namespace slipbench {
namespace {

const LaneSet* set_named(std::string_view name) {
  for (const auto& set : lane_sets()) {
    if (set.name != name) continue;
    if (set.available()) return &set;
    WARN("skipped: this processor has no " << name);
    return nullptr;
  }
  FAIL("no set " << name << " in this build");
  return nullptr;
}

double value_of(LanesFunction function, double a, double b) {
  switch (function) {
    case LanesFunction::sincos_sin:
      return slipbench::sincos(a).sin;
    case LanesFunction::sincos_cos:
      return slipbench::sincos(a).cos;
    case LanesFunction::turns_sin:
      return slipbench::sincos_turns(a).sin;
    case LanesFunction::turns_cos:
      return slipbench::sincos_turns(a).cos;
    case LanesFunction::atan2:
      return slipbench::atan2(a, b);
    case LanesFunction::exp:
      return slipbench::exp(a);
    case LanesFunction::log:
      return slipbench::log(a);
    case LanesFunction::wrap_angle:
      return slipbench::wrap_angle(a);
    case LanesFunction::sqrt:
      return std::sqrt(a);
    case LanesFunction::floor:
      return std::floor(a);
    case LanesFunction::fabs:
      return std::fabs(a);
    case LanesFunction::quotient:
      return a / b;
    case LanesFunction::smaller:
      return b < a ? b : a;
    case LanesFunction::larger:
      return b < a || (a != a && b == b) ? a : (a < b ? b : a);
  }
  return a;
}

// Every size a double can have, whole and half numbers, and the special ones.
std::vector<double> operands(std::size_t count, unsigned seed) {
  using Limits = std::numeric_limits<double>;
  std::vector<double> x{0.0,
                        -0.0,
                        0.5,
                        -0.5,
                        1.0,
                        -1.0,
                        1.5,
                        2.5,
                        -2.5,
                        3.14159265358979,
                        -3.14159265358979,
                        0x1p52,
                        -0x1p52,
                        0x1p53 + 2.0,
                        0x1.fffffffffffffp51,
                        -0x1.fffffffffffffp51,
                        Limits::min(),
                        Limits::denorm_min(),
                        Limits::max(),
                        -Limits::max(),
                        Limits::infinity(),
                        -Limits::infinity(),
                        Limits::quiet_NaN()};
  std::mt19937_64 bits(seed);
  std::uniform_real_distribution<double> unit(-1.0, 1.0);
  while (x.size() < count) {
    const std::size_t kind = x.size() % 4;
    x.push_back(kind == 0   ? 1e5 * unit(bits)
                : kind == 1 ? std::ldexp(unit(bits), static_cast<int>(1000.0 * unit(bits)))
                : kind == 2 ? std::floor(1e3 * unit(bits)) * 0.25
                            : 10.0 * unit(bits));
  }
  std::shuffle(x.begin(), x.end(), bits);
  return x;
}

void check_functions(const LaneSet& set) {
  constexpr std::size_t count = 16000;  // a multiple of every width
  const auto a = operands(count, 1), b = operands(count, 2);
  std::vector<double> result(count);
  for (int f = 0; f <= static_cast<int>(LanesFunction::larger); ++f) {
    LanesJob job;
    job.work = LanesWork::function;
    job.function = static_cast<LanesFunction>(f);
    job.cases = count;
    job.a = a.data(), job.b = b.data(), job.result = result.data();
    set.run(&job);
    std::size_t different = 0;
    for (std::size_t i = 0; i < count; ++i) different += !same_bits(result[i], value_of(job.function, a[i], b[i]));
    INFO("function " << f << " on " << set.name);
    CHECK(different == 0);
  }
}

// 20,000 steps of every method from varied machines; the voltage turns by a jump every 500 steps.
void check_machine(const LaneSet& set, Stepper stepper) {
  const std::size_t cases = 2 * set.width();
  constexpr std::int64_t rounds = 40, steps = 500;
  std::vector<double> constants, states;
  auto base = test_machine();
  each_number(base, [&](double& x) {
    for (std::size_t c = 0; c < cases; ++c) constants.push_back(x * (1.0 + 0.013 * static_cast<double>(c)));
  });
  for (double x : test_state) {
    for (std::size_t c = 0; c < cases; ++c) states.push_back(x * (1.0 - 0.02 * static_cast<double>(c)));
  }
  std::vector<MachineOnVoltage<double>> machines(cases);
  std::vector<MachineState<double>> alone(cases);
  for (std::size_t c = 0; c < cases; ++c) {
    std::size_t at = c;
    each_number(machines[c], [&](double& x) { x = constants[at], at += cases; });
    for (std::size_t i = 0; i < alone[c].size(); ++i) alone[c][i] = states[i * cases + c];
  }
  const std::size_t voltage = constants.size() - 2 * cases;
  std::size_t different = 0;
  for (std::int64_t round = 0; round < rounds; ++round) {
    LanesJob job;
    job.work = LanesWork::machine_steps;
    job.stepper = static_cast<std::int32_t>(stepper);
    job.cases = cases, job.steps = steps, job.step_s = 1e-5;
    job.constants = constants.data(), job.states = states.data();
    set.run(&job);
    const auto turned = slipbench::sincos_turns(0.02 * static_cast<double>(round));
    for (std::size_t c = 0; c < cases; ++c) {
      for (std::int64_t n = 0; n < steps; ++n)
        odeint_step(stepper, machines[c], alone[c], static_cast<double>(n) * 1e-5, 1e-5);
      for (std::size_t i = 0; i < alone[c].size(); ++i) different += !same_bits(alone[c][i], states[i * cases + c]);
      machines[c].voltage = {300.0 * turned.cos, 300.0 * turned.sin};
      constants[voltage + c] = machines[c].voltage.x;
      constants[voltage + cases + c] = machines[c].voltage.y;
    }
  }
  INFO("order " << order_of(stepper) << " on " << set.name);
  CHECK(different == 0);
  for (const auto& x : alone) CHECK(is_finite(x[4]));  // and something moved
  CHECK(alone[0] != test_state);
}

void check_set(std::string_view name) {
  const LaneSet* set = set_named(name);
  if (!set) return;
  check_functions(*set);
  for (Stepper stepper : {Stepper::euler, Stepper::midpoint, Stepper::rk4, Stepper::cash_karp5})
    check_machine(*set, stepper);
}

}  // namespace

TEST_CASE("lanes sse2: same bits as double", "[plant][bits][sse2]") { check_set("sse2"); }
TEST_CASE("lanes avx2: same bits as double", "[plant][bits][avx2]") { check_set("avx2"); }
TEST_CASE("lanes avx512: same bits as double", "[plant][bits][avx512]") { check_set("avx512"); }

TEST_CASE("lanes: the best set is available, and every set is listed once", "[plant][lanes]") {
  CHECK(best_lane_set().available());
  REQUIRE(lane_sets().size() == 3);
  CHECK(lane_sets()[0].name == "sse2");
}

TEST_CASE("lanes: get, set, masks and counts act lane by lane", "[plant][lanes]") {
  using Pack = Lanes<Sse2, 4>;
  Pack x(1.0);
  x.set(2, -5.0);
  CHECK((x.get(0) == 1.0 && x.get(2) == -5.0 && x.get(3) == 1.0));
  const auto below = x < Pack(0.0);
  CHECK((!below.get(1) && below.get(2)));
  CHECK(((!below).get(1) && !(below & !below).get(2) && (below | !below).get(0)));
  CHECK(LanesMask<Sse2, 4>(true).get(3));
  const Pack chosen = select(below, Pack(7.0), x);
  CHECK((chosen.get(2) == 7.0 && chosen.get(3) == 1.0));
  CountOf<Pack> n(40);
  n.set(1, -2);
  const auto sum = n + CountOf<Pack>(2);
  CHECK((sum.get(0) == 42 && sum.get(1) == 0 && (sum - n).get(3) == 2));
}

}  // namespace slipbench
