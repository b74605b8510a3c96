// Symbol: the emitted C is compiled with strict warnings, loaded back and compared bit for bit with the same source run in
// float (and double); folding and identities never change a bit.
#include <dlfcn.h>

#include <bit>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <fstream>
#include <limits>
#include <random>
#include <string>
#include <vector>

#include "plant/math/elementary.hpp"
#include "plant/math/symbol_text.hpp"
#include "sim/engine/steppers.hpp"
#include "tests/plant/bits.hpp"
#include "tests/plant/machines.hpp"

namespace slipbench {
namespace {

// Programs compiled into one shared object.
class Compiled {
 public:
  explicit Compiled(std::string name) : stem_(std::string(SLIPBENCH_SCRATCH) + "/emitted_" + name) {}
  ~Compiled() {
    if (library_) dlclose(library_);
  }
  Compiled(const Compiled&) = delete;
  Compiled& operator=(const Compiled&) = delete;
  template <class S>
  void add(const Program<S>& program, const std::string& function) {
    files_ += " '" + stem_ + "_" + function + ".c'";
    std::ofstream(stem_ + "_" + function + ".c") << program.emit_c(function);
  }
  void build(const std::string& optimisation) {
    const std::string object = stem_ + ".so";
    const std::string command =
        std::string("'") + SLIPBENCH_C_COMPILER + "' -std=c99 " + optimisation +
        " -ffp-contract=off -Wall -Wextra -Wconversion -Wdouble-promotion -pedantic -Werror -shared -fPIC -o '" +
        object + "'" + files_ + " -lm";
    INFO(command);
    REQUIRE(std::system(command.c_str()) == 0);
    library_ = dlopen(object.c_str(), RTLD_NOW | RTLD_LOCAL);
    REQUIRE(library_ != nullptr);
  }
  template <class F>
  F* function(const char* name) const {
    void* address = dlsym(library_, name);
    REQUIRE(address != nullptr);
    return reinterpret_cast<F*>(address);
  }

 private:
  std::string stem_, files_;
  void* library_ = nullptr;
};

template <class Real>
MachineState<Real> rates(const MachineOnVoltage<Real>& machine, const MachineState<Real>& x) {
  MachineState<Real> dxdt{};
  machine(x, dxdt, 0.0);
  return dxdt;
}

// Everything elementary of two numbers.
template <class Real>
std::array<Real, 10> elementary(const Real& x, const Real& y) {
  const auto angle = slipbench::sincos(x), turned = slipbench::sincos_turns(y);
  return {angle.sin,
          angle.cos,
          turned.sin,
          turned.cos,
          slipbench::atan2(y, x),
          slipbench::exp(x),
          slipbench::log(y),
          slipbench::wrap_angle(x),
          select((x < y) & !(x == -y), floor(x), fabs(y)),
          sqrt(fabs(x)) / y};
}

// The same as calls, each one function in the emitted code, with choices and whole numbers beside them.
template <class Real>
std::array<Real, 12> as_calls(const Real& x, const Real& y) {
  const auto angle = sincos(x), turned = sincos_turns(y);
  return {angle.sin,
          angle.cos,
          turned.sin,
          turned.cos,
          atan2(y, x),
          exp(x),
          log(fabs(y)),
          wrap_angle(x),
          clamp(x, -fabs(y), fabs(y)),
          min(x, y) - max(y, x * x),
          floor(x) - (x - (y - x)),
          -(x * (y / (x + y))) / (x * y)};
}

template <class S>
void check_against_simulation(const std::string& name, const std::string& optimisation) {
  using R = Symbol<S>;
  Program<S> right_hand_side, step, functions, calls;
  for (auto* program : {&right_hand_side, &step}) {
    MachineOnVoltage<R> machine;
    MachineState<R> x;
    program->inputs(machine, "machine");
    program->inputs(x, "state");
    program->name_fields("i_s", stator_current(machine.machine, MachineFlux<R>{{x[0], x[1]}, {x[2], x[3]}}));
    if (program == &right_hand_side)
      program->outputs(rates(machine, x), "rate");
    else
      odeint_step<Stepper::rk4>(machine, x, 0.0, 1e-4), program->outputs(x, "state");
  }
  const R x = functions.input("x"), y = functions.input("y");
  functions.outputs(elementary(x, y), "out");
  const R p = calls.input("x"), q = calls.input("y");
  calls.outputs(as_calls(p, q), "out");

  Compiled compiled(name);
  compiled.add(right_hand_side, "machine_rates");
  compiled.add(step, "machine_step");
  compiled.add(functions, "elementary");
  compiled.add(calls, "as_calls");
  compiled.build(optimisation);
  auto* c_rates = compiled.template function<void(const S*, const S*, S*)>("machine_rates");
  auto* c_step = compiled.template function<void(const S*, S*)>("machine_step");
  auto* c_calls = compiled.template function<void(const S*, S*)>("as_calls");
  auto* c_functions = compiled.template function<void(const S*, S*)>("elementary");

  std::mt19937_64 bits(7);
  std::uniform_real_distribution<double> unit(-1.0, 1.0);
  std::size_t different_rates = 0, different_steps = 0, different_functions = 0, different_calls = 0;
  for (int i = 0; i < 100000; ++i) {
    auto machine = in_number<MachineOnVoltage<S>, S>(test_machine());
    each_number(machine, [&](S& number) { number *= static_cast<S>(1.0 + 0.3 * unit(bits)); });
    MachineState<S> state;
    for (std::size_t k = 0; k < 5; ++k) state[k] = static_cast<S>((k < 4 ? 1.5 : 300.0) * unit(bits));
    std::vector<S> constants;
    each_number(machine, [&](S& number) { constants.push_back(number); });
    MachineState<S> rate{}, stepped = state;
    c_rates(constants.data(), state.data(), rate.data());
    c_step(constants.data(), stepped.data());
    const auto expected_rate = rates(machine, state);
    auto expected_step = state;
    odeint_step<Stepper::rk4>(machine, expected_step, 0.0, 1e-4);
    for (std::size_t k = 0; k < 5; ++k) different_rates += !same_bits(rate[k], expected_rate[k]);
    for (std::size_t k = 0; k < 5; ++k) different_steps += !same_bits(stepped[k], expected_step[k]);

    const double scale = std::exp2(20.0 * unit(bits) * (i % 7) / 7.0);
    const S in[2] = {static_cast<S>(30.0 * scale * unit(bits)), i % 100 ? static_cast<S>(scale * unit(bits)) : S(0)};
    S out[10];
    c_functions(in, out);
    const auto expected = elementary(in[0], in[1]);
    for (std::size_t k = 0; k < 10; ++k) different_functions += !same_bits(out[k], expected[k]);
    S called[12];
    c_calls(in, called);
    const auto expected_call = as_calls(in[0], in[1]);
    for (std::size_t k = 0; k < 12; ++k) different_calls += !same_bits(called[k], expected_call[k]);
  }
  CHECK(different_rates == 0);
  CHECK(different_steps == 0);
  CHECK(different_functions == 0);
  CHECK(different_calls == 0);
}

template <class S>
S first_output(const Program<S>& program, const std::string& name, std::vector<S> in) {
  Compiled compiled(name);
  compiled.add(program, "f");
  compiled.build("-O1");
  S out[1];
  compiled.template function<void(const S*, S*)>("f")(in.data(), out);
  return out[0];
}

}  // namespace

TEST_CASE("symbol: emitted C gives the bits of the float run", "[plant][symbol][bits]") {
  check_against_simulation<float>("float", "-O2");
}
TEST_CASE("symbol: emitted C gives the bits of the double run, unoptimised too", "[plant][symbol][bits]") {
  check_against_simulation<double>("double", "-O0");
}

TEST_CASE("symbol: only identities that keep every bit are used", "[plant][symbol]") {
  Program<float> p;
  using R = Symbol<float>;
  const R x = p.input("x"), y = p.input("y"), zero(0.0), minus_zero(-0.0), one(1.0);
  const auto same = [](const R& a, const R& b) {
    return a.node().graph == b.node().graph && a.node().id == b.node().id;
  };
  CHECK((same(x * one, x) && same(x / one, x) && same(x - zero, x) && same(x + minus_zero, x) && same(-(-x), x)));
  CHECK((same(x * R(-1.0), -x) && same(minus_zero - x, -x) && same(x + (-y), x - y) && same(x - (-y), x + y)));
  CHECK((same(x * x + zero, x * x) && same(fabs(-x), fabs(x))));
  CHECK((same(x + y, y + x) && same(x * y, y * x)));  // one node for both
  // These would change a bit: -0 + 0 is +0, infinity * 0 is NaN, 0 - x is +0 at x = 0, x - x is NaN at infinity.
  CHECK_FALSE(same(x + zero, x));
  CHECK_FALSE(same(x - minus_zero, x));
  CHECK_FALSE((x * zero).is_constant());
  CHECK_FALSE(same(zero - x, -x));
  CHECK_FALSE((x - x).is_constant());
  CHECK_FALSE((x / x).is_constant());
  CHECK_FALSE(same(x / R(3.0), x * R(1.0 / 3.0)));
  // Constants fold in the precision that is emitted.
  CHECK((R(0.1) + R(0.2)).value() == 0.1f + 0.2f);
  CHECK(sqrt(R(2.0)).value() == std::sqrt(2.0f));
}

TEST_CASE("symbol: signed zeros, infinities and NaN come through emitted code", "[plant][symbol]") {
  Program<float> plus;
  plus.output("y", plus.input("x") + Symbol<float>(0.0));
  CHECK(bits_of(first_output(plus, "plus_zero", {-0.0f})) == bits_of(0.0f));
  Program<float> times;
  times.output("y", times.input("x") * Symbol<float>(0.0));
  CHECK(std::isnan(first_output(times, "times_zero", {std::numeric_limits<float>::infinity()})));
  Program<double> constants;
  using R = Symbol<double>;
  const R x = constants.input("x");
  constants.output("y", select(x < R(0.0), R(-std::numeric_limits<double>::infinity()),
                               R(std::numeric_limits<double>::quiet_NaN())));
  CHECK(first_output(constants, "constants", {-1.0}) == -std::numeric_limits<double>::infinity());
  CHECK(std::isnan(first_output(constants, "constants_again", {1.0})));
}

TEST_CASE("symbol: shared subexpressions and names show in the text", "[plant][symbol]") {
  Program<float> p;
  const auto x = p.input("x"), y = p.input("double");  // a word of C
  const auto sum = x * x + y * y;
  p.name("length2", sum);
  p.output("a", sum / (y * y + x * x));
  p.output("b", sqrt(sum));
  CHECK(p.operation_counts()[SymbolOp::multiply] == 2);
  CHECK(p.operation_counts()[SymbolOp::add] == 1);
  const std::string c = p.emit_c("ratio");
  CHECK(c.find("const float length2 = ") != std::string::npos);
  CHECK(c.find("void ratio(const float in[2], float out[2])") != std::string::npos);
  CHECK(c.find("const float double_2 = in[1]") != std::string::npos);
  CHECK(c.find("sqrtf(length2)") != std::string::npos);
}

TEST_CASE("symbol: floor without a library is that of the C library to the bit", "[plant][symbol][bits]") {
  Program<float> p;
  p.output("y", floor(p.input("x")));
  Compiled compiled("floor");
  compiled.add(p, "own_floor");
  compiled.build("-O2");
  auto* own = compiled.function<void(const float*, float*)>("own_floor");
  std::size_t different = 0;
  for (std::uint64_t bits = 0; bits < (std::uint64_t{1} << 32); bits += 997) {  // a prime: all exponents, both signs
    const float x = std::bit_cast<float>(static_cast<std::uint32_t>(bits));
    float y;
    own(&x, &y);
    different += std::isnan(x) ? !std::isnan(y) : bits_of(y) != bits_of(std::floor(x));
  }
  for (const float x : {-0.0f, 0.0f, -0.5f, 0.5f, 8388607.5f, -8388607.5f, 8388608.0f, 4194304.5f, -1.0f}) {
    float y;
    own(&x, &y);
    different += bits_of(y) != bits_of(std::floor(x));
  }
  CHECK(different == 0);
}

TEST_CASE("symbol: labels and headings of a step show, names of constants and how others came about",
          "[plant][symbol]") {
  Program<float> p;
  using R = Symbol<float>;
  const R resistance = R::named(1.48, "R_s"), period = R::named(1e-4, "T");
  {
    const Program<float>::Listening listening(p);
    const R i = p.input("i");
    section<R>("drop = R_s i");
    const R drop = resistance * i;
    SLIPBENCH_LABEL(drop)
    p.output("u", drop * (i - drop) + (resistance * period) * i);
  }
  section<R>("heard by nobody");
  const Body<float> body = body_of(p, {}, Constants::named, "");
  CHECK(body.constants.find("static const float R_s = 0x1.7ae148p+0f; /* 1.48 */") != std::string::npos);
  CHECK(body.constants.find("= R_s * T */") != std::string::npos);
  CHECK(body.statements.find("/* drop = R_s i */\n  const float drop = ") != std::string::npos);
  CHECK(body.statements.find("nobody") == std::string::npos);
  CHECK(body.operations.multiply == 3);
  CHECK(body.operations.add == 2);
}

TEST_CASE("symbol: two programs never mix", "[plant][symbol]") {
  Program<float> p, q;
  const auto x = p.input("x"), y = q.input("y");
  CHECK_THROWS_AS(x + y, std::logic_error);
}

}  // namespace slipbench
