// Compiled once per instruction set, with its flags and
//   SLIPBENCH_ISA    tag of plant/math/lanes.hpp
//   SLIPBENCH_LANES  width, by measurement
//   SLIPBENCH_ENTRY  the one symbol that stays visible (see CMakeLists.txt)
// Includes only plant and engine templates, so that nothing here is shared with code built for a lesser processor.
#include "plant/math/elementary.hpp"
#include "plant/math/lanes.hpp"
#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/lanes/machine_step.hpp"
#include "sim/engine/lanes/run_unit.hpp"
#include "sim/engine/steppers.hpp"

namespace slipbench {
namespace {

using Pack = Lanes<SLIPBENCH_ISA, SLIPBENCH_LANES>;

template <class Item>
SLIPBENCH_INLINE void load(Item& item, const double* from, std::size_t cases) {
  each_number(item, [&](Pack& x) { x = Pack::load(from), from += cases; });
}
template <class Item>
SLIPBENCH_INLINE void store(const Item& item, double* to, std::size_t cases) {
  each_number(item, [&](const Pack& x) { x.store(to), to += cases; });
}

template <Stepper method>
[[gnu::flatten]] void machine_steps(const LanesJob& job) {
  for (std::size_t c = 0; c < job.cases; c += Pack::width) {
    MachineOnVoltage<Pack> machine;
    MachineState<Pack> x;
    load(machine, job.constants + c, job.cases);
    load(x, job.states + c, job.cases);
    for (std::int64_t n = 0; n < job.steps; ++n) {
      odeint_step<method>(machine, x, static_cast<double>(n) * job.step_s, job.step_s);
    }
    store(x, job.states + c, job.cases);
  }
}

Pack value_of(LanesFunction function, const Pack& a, const Pack& b) {
  switch (function) {
    case LanesFunction::sincos_sin:
      return sincos(a).sin;
    case LanesFunction::sincos_cos:
      return sincos(a).cos;
    case LanesFunction::turns_sin:
      return sincos_turns(a).sin;
    case LanesFunction::turns_cos:
      return sincos_turns(a).cos;
    case LanesFunction::atan2:
      return atan2(a, b);
    case LanesFunction::exp:
      return exp(a);
    case LanesFunction::log:
      return log(a);
    case LanesFunction::wrap_angle:
      return wrap_angle(a);
    case LanesFunction::sqrt:
      return sqrt(a);
    case LanesFunction::floor:
      return floor(a);
    case LanesFunction::fabs:
      return fabs(a);
    case LanesFunction::quotient:
      return a / b;
    case LanesFunction::smaller:
      return min(a, b);
    case LanesFunction::larger:
      return select((b < a) | ((a != a) & (b == b)), a, max(a, b));
  }
  return a;
}

void functions(const LanesJob& job) {
  for (std::size_t c = 0; c < job.cases; c += Pack::width) {
    value_of(job.function, Pack::load(job.a + c), job.b ? Pack::load(job.b + c) : Pack{}).store(job.result + c);
  }
}

}  // namespace
}  // namespace slipbench

extern "C" void SLIPBENCH_ENTRY(slipbench::LanesJob* job) {
  using namespace slipbench;
  switch (job->work) {
    case LanesWork::width:
      job->cases = Pack::width;
      return;
    case LanesWork::function:
      return functions(*job);
    case LanesWork::run:
      return run_in_lanes(*job->drive);
    case LanesWork::drop:
      return drop_lanes(*job->drive);
    case LanesWork::settle:
      return settle_in_lanes(*job->drive);
    case LanesWork::machine_steps:
      switch (static_cast<Stepper>(job->stepper)) {
        case Stepper::euler:
          return machine_steps<Stepper::euler>(*job);
        case Stepper::midpoint:
          return machine_steps<Stepper::midpoint>(*job);
        case Stepper::rk4:
          return machine_steps<Stepper::rk4>(*job);
        case Stepper::cash_karp5:
          return machine_steps<Stepper::cash_karp5>(*job);
      }
  }
}
