// The true drive at t = 0, as the engine sets it up: circuit and inertia with their drift, and what resists the shaft.
#pragma once

#include "plant/math/dual.hpp"
#include "sim/engine/plant.hpp"
#include "sim/engine/setup.hpp"

namespace slipbench {

struct Truth {
  RunSetup setup;
  Plant<double> plant;  // at the setup's first state
  Circuit<double> circuit;
  double inertia = 0.0;  // kg m^2

  explicit Truth(RunSetup ready) : setup(std::move(ready)), plant(plant_of(setup)), circuit(plant.circuit()) {
    plant.set_state(flux_of(setup.state.drive), setup.state.drive[4]);
    inertia = setup.plant.inertia;
    for (std::size_t i = 0; i < setup.drifts.size(); ++i) {
      if (setup.shape.plant.drifts[i] == Drifting::inertia) inertia *= Profile(setup.drifts[i]).line_at(0.0).at(0.0);
    }
  }

  // How fast load and friction grow with speed there, N m s.
  [[nodiscard]] double damping(double speed_rad_s) const {
    using D = Dual<double, 1>;
    auto drive = in_number<Drive<D>, D>(setup.plant.drive);
    drive.opposed = setup.shape.plant.opposed;
    return total_resistance(drive, DriveInput<D>{}, D::variable(speed_rad_s, 0), 0.0).slope[0];
  }

 private:
  static Plant<double> plant_of(const RunSetup& setup) {
    const RunSetup* alone = &setup;
    return Plant<double>({&alone, 1});
  }
};

}  // namespace slipbench
