// Runs the cases of one noise run: those of like structure side by side in packs, the others alone in double. One a thread.
#pragma once

#include <cstdint>
#include <functional>
#include <map>
#include <string>
#include <vector>

#include "sim/engine/setup.hpp"
#include "sim/scenario/scenario.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

struct LaneSet;

struct PackCase {
  Scenario scenario;
  ResultRow* row = nullptr;  // gets status, message and figures
};

class PackRunner {
 public:
  // isa: "" the widest set that this processor has, "double" none, else a set by its name. InputError where there is no such set or
  // the processor lacks it. `keep_going` is asked now and then while a pack runs.
  PackRunner(const std::string& isa, std::function<bool()> keep_going);

  void run(std::vector<PackCase>& cases, std::uint32_t noise_run);

  [[nodiscard]] const std::string& isa() const { return isa_; }
  [[nodiscard]] std::size_t lanes() const { return lanes_; }
  [[nodiscard]] std::uint64_t in_lanes() const { return in_lanes_; }
  [[nodiscard]] double simulated_s() const { return simulated_s_; }
  [[nodiscard]] const std::map<std::string, std::uint64_t>& not_in_lanes() const { return not_in_lanes_; }

 private:
  // A case that is set up and waits for its pack.
  struct Ready {
    PackCase* one;
    RunSetup setup;
  };
  void run_alone(PackCase& one, std::uint32_t noise_run, const std::string& why);
  void run_together(const std::vector<Ready*>& pack);

  std::string isa_;
  bool forced_;                   // a set that was asked for by name takes packs of any filling
  const LaneSet* set_ = nullptr;  // none: all alone
  std::size_t lanes_ = 1;
  std::function<bool()> keep_going_;
  std::uint64_t in_lanes_ = 0;
  double simulated_s_ = 0.0;
  std::map<std::string, std::uint64_t> not_in_lanes_;
};

}  // namespace slipbench
