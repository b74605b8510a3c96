// Runs the cases of one noise run: those of like structure side by side in packs, the others alone in double.
#pragma once

#include <cstdint>
#include <functional>
#include <map>
#include <string>
#include <vector>

#include "sim/scenario/scenario.hpp"
#include "sim/sweep/store.hpp"
#include "sim/sweep/work.hpp"

namespace slipbench {

struct LaneSet;

struct PackCase {
  Scenario scenario;
  ResultRow* row = nullptr;  // gets status, message and figures
};

// How cases were run.
struct RanHow {
  std::uint64_t in_lanes = 0;
  double simulated_s = 0.0;
  std::map<std::string, std::uint64_t> not_in_lanes;  // by reason
  void add(const RanHow& more);
};

class PackRunner {
 public:
  using KeepGoing = std::function<bool()>;
  // Called once, by whoever ran the last piece.
  using Ended = std::function<void(const RanHow&)>;

  // isa: "" the widest set that this processor has, "double" none, else a set by its name. InputError where there is no such set or
  // the processor lacks it. `keep_going` is asked now and then, from any thread; where it says no, the cases never end.
  PackRunner(const std::string& isa, KeepGoing keep_going);

  // Adds the cases to the work as pieces that any threads may run: runs alone, and turns of packs. Rows must live until they end;
  // the runner, too.
  void start(std::vector<PackCase> cases, std::uint32_t noise_run, Work& work, Ended ended) const;
  // All of it in the calling thread.
  void run(std::vector<PackCase> cases, std::uint32_t noise_run) const;

  [[nodiscard]] const std::string& isa() const { return isa_; }
  [[nodiscard]] std::size_t lanes() const { return lanes_; }

 private:
  class Group;
  std::string isa_;
  bool forced_;                   // a set that was asked for by name takes packs of any filling
  const LaneSet* set_ = nullptr;  // none: all alone
  std::size_t lanes_ = 1;
  KeepGoing keep_going_;
};

}  // namespace slipbench
