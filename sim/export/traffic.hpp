// What went through the doors of estimators and controller in a run: samples, measurements and answers, tick by tick.
#pragma once

#include <vector>

#include "sim/engine/observer.hpp"

namespace slipbench {

// Numbers of one door, a row a tick, in the order of each_number.
struct DoorTraffic {
  std::size_t in_width = 0, out_width = 0;
  std::vector<double> in, out;
  [[nodiscard]] std::size_t ticks() const { return in_width == 0 ? 0 : in.size() / in_width; }
  [[nodiscard]] std::span<const double> seen(std::size_t k) const { return {in.data() + k * in_width, in_width}; }
  [[nodiscard]] std::span<const double> answered(std::size_t k) const {
    return {out.data() + k * out_width, out_width};
  }
};

class Traffic final : public RunObserver {
 public:
  std::vector<DoorTraffic> estimators;  // in file order
  DoorTraffic controller;

  void begin(const RunInfo& info) override { estimators.resize(info.estimator_names.size()); }
  void control_tick(const TickView& tick) override {
    for (std::size_t i = 0; i < estimators.size(); ++i) keep(estimators[i], *tick.sample, tick.estimates[i]);
    if (tick.measurement != nullptr) keep(controller, *tick.measurement, *tick.command);
  }

 private:
  template <class In, class Out>
  static void keep(DoorTraffic& door, const In& in, const Out& out) {
    const std::size_t in_before = door.in.size(), out_before = door.out.size();
    each_number(in, [&](const double& x) { door.in.push_back(x); });
    each_number(out, [&](const double& x) { door.out.push_back(x); });
    door.in_width = door.in.size() - in_before, door.out_width = door.out.size() - out_before;
  }
};

}  // namespace slipbench
