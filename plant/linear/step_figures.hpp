// What one reads off a step response: overshoot, rise 10-90 %, settling 2 %, steady error.
//
// final is the value the response goes to (the caller's DC gain times the step); where there is none, the last sample. Crossings are
// interpolated linearly between samples, the peak by a parabola through three; so their error is of the second (third) order in the spacing.
// A discrete system's peak is its largest sample, and its crossings the first samples beyond: a parabola would see 12.5 % in 0, 1, 1, 1.
//   overshoot     (largest y - final) / |final - first| on the far side of final, 0 if never beyond
//   rise_s        from 10 % to 90 % of the way; negative: not reached
//   settling_s    last time outside +-2 % of the way (discrete: the first sample that stays inside); negative: not settled in the record
//   steady_error  wished - final
// Source: common practice; K. Ogata, "Modern Control Engineering", ch. 5.
#pragma once

#include <optional>

#include "plant/linear/response.hpp"

namespace slipbench::linear {

struct StepFigures {
  double final = 0.0, overshoot = 0.0, peak_time_s = 0.0, rise_s = -1.0, settling_s = -1.0, steady_error = 0.0;
};

StepFigures step_figures(const Response& response, Eigen::Index output, double wished,
                         std::optional<double> final = {});

}  // namespace slipbench::linear
