// Synthetic runs for the scores: a plant row and estimates at every control tick, without an engine.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "sim/engine/observer.hpp"

namespace slipbench::test {

struct Stream {
  double control_period_s = 1e-3;
  std::int64_t ticks = 1001;  // 0 .. 1 s, both ends in
  std::vector<std::string> names = {"one"};

  // fill(t, plant row, estimates, clipped) makes the tick at time t.
  using Fill = std::function<void(double, PlantRow&, std::vector<Estimate<double>>&, bool&)>;

  void feed(RunObserver& observer, const Fill& fill) const {
    RunInfo info;
    info.control_period_s = control_period_s;
    info.trace_period_s = control_period_s;
    info.duration_s = static_cast<double>(ticks - 1) * control_period_s;
    info.plant = plant_columns();
    info.estimator_names = names;
    info.estimator_kinds.assign(names.size(), "synthetic");
    observer.begin(info);
    for (std::int64_t k = 0; k < ticks; ++k) {
      PlantRow plant{};
      std::vector<Estimate<double>> estimates(names.size());
      bool clipped = false;
      plant[P::time] = static_cast<double>(k) * control_period_s;
      fill(plant[P::time], plant, estimates, clipped);
      observer.control_tick({k, plant[P::time], &plant, estimates, clipped});
    }
    observer.end();
  }
};

inline constexpr double rad_s_a_rpm = 3.14159265358979323846 / 30.0;

}  // namespace slipbench::test
