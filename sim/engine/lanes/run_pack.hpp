// A pack of cases run side by side in lanes, each with the bits that simulate() gives it alone.
//
//   if (lanes_can_run(scenario).empty()) { ... }
//   RunSetup a = ready_run(scenario_a, 0), b = ready_run(scenario_b, 0);      // equal shapes: may share a pack
//   const RunSetup* cases[] = {&a, &b};                                       // at most set.width(); fewer leave lanes idle
//   const std::vector<RunOutcome> outcomes = run_pack(set, cases, observers);
//
// A lane whose drive diverges is told of and left out from then on; the others go on. Calls come from the calling thread, in
// order of time; several threads may run packs of their own. The loop itself allocates nothing.
#pragma once

#include <memory>
#include <span>
#include <string>
#include <vector>

#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/lost.hpp"
#include "sim/engine/plant_row.hpp"
#include "sim/engine/simulate.hpp"

namespace slipbench {

// What a control tick, or a trace row, of a pack looks like: LanesView's columns, and which lanes count.
struct PackView : LanesView {
  std::size_t width = 0;                // lanes a column has
  std::span<const std::uint8_t> lanes;  // one a case; 0: lost before

  [[nodiscard]] const double* column(P which) const { return plant + static_cast<std::size_t>(which) * width; }
  // Number `field` of an estimate, in the order of Estimate's fields.
  [[nodiscard]] const double* estimate(std::size_t estimator, std::size_t field) const {
    return estimates + estimator * estimate_stride + field * width;
  }
};

class PackObserver {
 public:
  virtual ~PackObserver() = default;
  virtual void control_tick(const PackView&) {}
  virtual void trace_row(const PackView&) {}
  [[nodiscard]] virtual bool wants_rows() const { return false; }
  virtual void lost(std::size_t /*lane*/, std::int64_t /*tick*/, Lost) {}        // after that tick was told
  [[nodiscard]] virtual bool keep_going(std::int64_t /*tick*/) { return true; }  // asked at every tick
};

// A pack that is gone through in turns. Any thread may do a turn, one at a time; cases and observer stay where they are.
class PackRun {
 public:
  PackRun(const LaneSet& set, Cases cases, PackObserver& observer);
  ~PackRun();
  PackRun(const PackRun&) = delete;
  PackRun& operator=(const PackRun&) = delete;

  // At most so many control ticks more; true: the run has ended. Throws OutsideError as simulate() does,
  // std::bad_alloc, and what the observer throws.
  bool go_on(std::int64_t ticks);
  // How each case ended. step_ns and events stay empty, wall_s is an equal share of the pack's turns.
  [[nodiscard]] std::vector<RunOutcome> outcomes() const;

 private:
  struct Whole;
  std::unique_ptr<Whole> whole_;
};

// The same in one turn.
std::vector<RunOutcome> run_pack(const LaneSet& set, Cases cases, PackObserver& observer);

// The same with observers of single runs, a list for each case: begin, ticks, rows as simulate() tells them, end.
// `keep_going` is asked now and then; false stops the pack.
std::vector<RunOutcome> run_pack(const LaneSet& set, Cases cases, std::span<const std::vector<RunObserver*>> observers,
                                 const std::function<bool()>& keep_going = {});

// Why lanes cannot run this scenario (then simulate() must); empty: they can.
std::string lanes_can_run(const Scenario& scenario);

}  // namespace slipbench
