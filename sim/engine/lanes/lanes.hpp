// Work done in lanes on the best instruction set that the processor has, or on a named one: the door to the units compiled
// once per set. All sets give the same bits.
//
// Numbers travel as plain arrays, structure of arrays: number f of case c stands at [f * cases + c]; numbers in the order of
// each_number. `cases` is a whole multiple of the set's width.
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string_view>

#include "sim/engine/lanes/run_job.hpp"

namespace slipbench {

enum class LanesWork : std::int32_t { width, machine_steps, function, run, drop, settle };
enum class LanesFunction : std::int32_t {
  sincos_sin,
  sincos_cos,
  turns_sin,
  turns_cos,
  atan2,
  exp,
  log,
  wrap_angle,
  sqrt,
  floor,
  fabs,
  quotient,
  smaller,
  larger
};

// One call of a unit. What a piece of work does not use stays as it is.
struct LanesJob {
  LanesWork work = LanesWork::width;
  LanesFunction function = LanesFunction::exp;
  std::int32_t stepper = 2;  // a Stepper, see sim/engine/steppers.hpp
  std::size_t cases = 0;     // width: answered here
  std::int64_t steps = 0;
  double step_s = 0.0;
  const double* constants = nullptr;        // machine_steps: MachineOnVoltage
  double* states = nullptr;                 // machine_steps: five numbers, advanced in place
  const double *a = nullptr, *b = nullptr;  // function: operands (b of two)
  double* result = nullptr;
  LanesRun* drive = nullptr;  // run, settle: whole drives; run_pack.hpp is the way in
};

struct LaneSet {
  std::string_view name;   // "sse2", "avx2", "avx512"
  bool (*available)();     // on this processor
  void (*run)(LanesJob*);  // only where available
  [[nodiscard]] std::size_t width() const {
    LanesJob job;
    run(&job);
    return job.cases;
  }
};

// Every set in this build, narrowest first.
std::span<const LaneSet> lane_sets();
// The widest set that this processor has.
const LaneSet& best_lane_set();

}  // namespace slipbench
