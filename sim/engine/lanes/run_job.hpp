// What crosses the C entry for a whole run: W setups go in, every control tick of the pack comes out through plain function
// pointers. Nothing may throw through them. A run may be gone through in several calls, on any thread.
#pragma once

#include <cstddef>
#include <cstdint>

namespace slipbench {

struct RunSetup;

// A control tick, or a trace row, of all lanes. Column c of lane l stands at [c * width + l]; number f of estimator e at
// [e * estimate_stride + f * width + l]. Orders: P of plant_row.hpp, Estimate's fields, the measured columns.
struct LanesView {
  std::int64_t index = 0;  // of the tick, or of the row
  double time_s = 0.0;
  const double* plant = nullptr;
  const double* estimates = nullptr;
  std::size_t estimate_stride = 0;
  const double* clipped = nullptr;   // one number a lane: not 0 where the controller's voltage limit acted
  const double* measured = nullptr;  // rows only
};

struct LanesSink {
  void* self = nullptr;
  bool rows = false;                                // whether rows are wanted
  bool (*tick)(void* self, const LanesView* view);  // false ends the run
  void (*row)(void* self, const LanesView* view);
  // What of a lane went wrong at a tick (a Lost), after that tick was told. From then on the lane tells nothing that counts.
  void (*lost)(void* self, std::size_t lane, std::int64_t tick, std::int32_t what);
};

struct LanesRun {
  const RunSetup* const* cases = nullptr;  // as many as the set is wide, all of one shape
  std::size_t used = 0;                    // lanes that count; the pack ends when the last of them is lost
  const LanesSink* sink = nullptr;
  std::int64_t ticks = 0;              // control ticks to go on for, at most
  void* drive = nullptr;               // the pack as it stands; none: it is set up first. LanesWork::drop frees it
  bool over = false;                   // answered: the run has ended
  std::int64_t ended_at_step = 0;      // answered then
  double* clipped_samples = nullptr;   // answered then, one a lane
  double* moving = nullptr;            // run-in only, answered: how much each lane still moves
  RunSetup* const* settled = nullptr;  // run-in only: setups of the used lanes, to be written as they stand at t = 0
  bool failed = false;                 // answered: out of memory while it was set up
};

}  // namespace slipbench
