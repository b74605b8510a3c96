// What the score is measured by: the window, the limits, and the rated values they are shares of.
//
// A tick k belongs to the window when from_s <= k T_c <= to_s (both ends in, to within 1e-6 of a control period T_c).
// Rated rotor flux: that of the true circuit at rated voltage, frequency and speed.
#pragma once

#include <array>
#include <cstdint>
#include <vector>

#include "plant/parameters.hpp"
#include "plant/profile.hpp"

namespace slipbench {

struct Scenario;

struct ScoreWindow {
  double from_s = 0.0, to_s = 0.0;

  [[nodiscard]] bool holds(double time_s, double control_period_s) const {
    const double slack = 1e-6 * control_period_s;
    return time_s >= from_s - slack && time_s <= to_s + slack;
  }
};

struct ScoreBasis {
  ScoreWindow window;
  double control_period_s = 0.0;
  double rated_speed_rpm = 0.0, rated_rotor_flux_Wb = 0.0;
  double lost_error = 0.1, lost_for_s = 0.05, settled_error = 0.02;  // errors as shares of rated speed
  std::vector<double> load_steps_s;                                  // jumps of `profile` loads, ascending
  Circuit<double> circuit;  // true at t = 0; its inductances serve the rotor current
  Profile magnetizing_factor{{}, 1.0, 1.0}, stator_leakage_factor{{}, 1.0, 1.0}, rotor_leakage_factor{{}, 1.0, 1.0};
  bool has_controller = false;
};

ScoreBasis score_basis(const Scenario& scenario);

}  // namespace slipbench
