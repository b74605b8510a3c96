// The loops that a design makes, asked the same questions: a step of the reference, a disturbance, a frequency.
#include <Eigen/LU>
#include <algorithm>
#include <cmath>

#include "plant/linear/frequency_response.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/zeros.hpp"
#include "tools/slipbench/design_result.hpp"

namespace slipbench {

namespace {

using linear::Complex;
using linear::LinearError;
using linear::Matrix;
using linear::System;

constexpr double two_pi = 6.283185307179586;

void add(DesignResult& r, const std::string& name, System system, Eigen::Index references) {
  const linear::Verdict verdict = linear::stability_of(system);
  r.loops.push_back({name, std::move(system), references, verdict.stability == linear::Stability::stable, verdict.why});
}

// N's columns are for the tracked outputs; the loops take one for each output of the plant.
Matrix spread(const DesignResult& r) {
  Matrix N = Matrix::Zero(r.plant.inputs(), r.plant.outputs());
  for (std::size_t k = 0; k < r.tracked.size(); ++k)
    N.col(r.tracked[k]) = r.reference->N.col(static_cast<Eigen::Index>(k));
  return N;
}

System tracked_plant(const DesignResult& r) {
  System s = r.plant;
  const auto q = static_cast<Eigen::Index>(r.tracked.size());
  s.C.resize(q, s.order()), s.D.resize(q, s.inputs());
  s.output_names.clear();
  for (Eigen::Index k = 0; k < q; ++k) {
    const Eigen::Index from = r.tracked[static_cast<std::size_t>(k)];
    s.C.row(k) = r.plant.C.row(from), s.D.row(k) = r.plant.D.row(from);
    s.output_names.push_back(r.plant.output_name(from));
  }
  return s;
}

double largest(const Matrix& m, Eigen::Index from) {
  return m.cols() > from ? m.rightCols(m.cols() - from).cwiseAbs().maxCoeff() : 0.0;
}

// Rms of the efforts per unit white noise on every measurement; none where noise passes straight to them in continuous time.
std::optional<double> effort_noise(const System& s, Eigen::Index first_noise, Eigen::Index first_effort) {
  const Matrix B = s.B.rightCols(s.inputs() - first_noise), C = s.C.bottomRows(s.outputs() - first_effort),
               D = s.D.bottomRightCorner(C.rows(), B.cols());
  if (!s.discrete() && !D.isZero(0.0)) return {};
  const Matrix spread = s.discrete() ? linear::stein(s.A, B * B.transpose()) : linear::lyapunov(s.A, B * B.transpose());
  Matrix power = C * spread * C.transpose();
  if (s.discrete()) power += D * D.transpose();
  return std::sqrt(std::max(0.0, power.trace()));
}

LoopRow row_of(const DesignResult& r, std::size_t number, Eigen::Index pair) {
  const Loop& loop = r.loops[number];
  const LoopPort port = port_of(r, loop, pair);
  LoopRow row;
  row.loop = number, row.pair = pair;
  if (r.at_Hz > 0.0) {
    try {
      const auto point = linear::frequency_response(loop.system, two_pi * r.at_Hz);
      row.gain = point.gain(port.output, port.input);
      row.phase_deg = point.phase_rad(port.output, port.input) * 360.0 / two_pi;
    } catch (const LinearError&) {  // a pole stands there: no gain
    }
  }
  if (!loop.stable) return row;
  const TimeGrid grid = grid_for(loop.system);
  const double step_s = loop.system.discrete() ? 0.0 : grid.step_s;
  const Matrix dc = linear::dc_gain(loop.system);
  const auto answer = linear::step_response(loop.system, port.input, step_s, grid.steps);
  row.step = linear::step_figures(answer, port.output, 1.0, dc(port.output, port.input));
  const bool pi = r.kind == DesignKind::pi;
  const Eigen::Index outputs = loop.system.outputs() - r.plant.inputs();  // before the efforts
  if (loop.system.outputs() > outputs) row.effort = largest(answer.y, outputs);
  if (!pi && pair < r.plant.inputs()) {
    const Eigen::Index d = loop.references + pair;
    const auto pushed = linear::step_response(loop.system, d, step_s, grid.steps);
    row.dip = pushed.y.col(port.output).cwiseAbs().maxCoeff();
    row.left = dc(port.output, d);
    if (std::fabs(*row.left) < 1e-12 * *row.dip) row.left = 0.0;  // rounding beside what it settles from
    row.noise = effort_noise(loop.system, loop.references + r.plant.inputs(), outputs);
  }
  return row;
}

// Gain of the integrating plant at low frequency, lim s G(s); 0 where no pole stands at 0.
double velocity_gain(const System& s, double nearness) {
  Eigen::FullPivLU<Matrix> right(s.A), left(s.A.transpose());
  right.setThreshold(nearness), left.setThreshold(nearness);
  if (right.dimensionOfKernel() != 1) return 0.0;
  const linear::Vector v = right.kernel().col(0), w = left.kernel().col(0);
  return (s.C * v)(0) * (w.transpose() * s.B)(0) / w.dot(v);
}

// Large and small lags of the plant, where [design] does not give them.
struct Lags {
  double gain = 0.0, large = 0.0, small = 0.0;
};
Lags lags_of(const System& s, const DesignRequest& d) {
  Lags lags;
  bool integrates = false;
  double others = 0.0;
  for (const linear::Mode& m : linear::modes_of(s)) {
    if (m.frequency_rad_s <= linear::stability_of(s).tolerance) {
      integrates = true;
      continue;
    }
    if (m.pole.real() > 0.0)
      throw LinearError("the pole at " + linear::text_of(m.pole) + " grows: these rules are for plants of lags");
    const double lag = (-1.0 / m.pole).real();
    if (m.pole.imag() == 0.0 && lag > lags.large && !integrates)
      others += lags.large, lags.large = lag;
    else
      others += lag;
  }
  if (integrates && d.rule == "magnitude_optimum")
    throw LinearError(
        "the pole at 0 integrates: the magnitude optimum would divide by it; take rule = \"symmetric_optimum\"");
  if (integrates) {
    others += lags.large;  // a lag beside the integrator is a small one
    const double velocity = velocity_gain(s, 1e-12);
    lags.gain = 1.0, lags.large = velocity != 0.0 ? 1.0 / velocity : 0.0;
    if (lags.large < 0.0) lags.gain = -1.0, lags.large = -lags.large;
  } else if (!d.plant_gain) {
    lags.gain = linear::dc_gain(s)(0, 0);
  }
  lags.small = others;
  lags.gain = d.plant_gain.value_or(lags.gain), lags.large = d.large_lag_s.value_or(lags.large);
  lags.small = d.small_lag_s.value_or(lags.small);
  if (!(lags.small > 0.0))
    throw LinearError(
        "the plant has no small lag beside the large one: give design.small_lag_s (inverter, sampling, filters)");
  return lags;
}

}  // namespace

LoopPort port_of(const DesignResult& r, const Loop& loop, Eigen::Index pair) {
  const Eigen::Index tracked = r.tracked.empty() ? 0 : r.tracked[static_cast<std::size_t>(pair)];
  if (loop.name == "integral action" || r.kind == DesignKind::pi) return {pair, pair};
  const bool by_output = loop.name == "reference gain" || loop.name == "with observer";
  return {by_output ? tracked : pair, tracked};
}

void design_pi(DesignResult& r, const DesignRequest& d) {
  const System& s = r.plant;
  if (s.inputs() != 1 || s.outputs() != 1)
    throw LinearError("a PI controller is for one input and one output; this plant has " + std::to_string(s.inputs()) +
                      " and " + std::to_string(s.outputs()));
  if (s.discrete()) throw LinearError("these PI rules are for continuous plants; this one is sampled");
  const Lags lags = lags_of(s, d);
  r.pi_gain = lags.gain, r.pi_large_lag_s = lags.large, r.pi_small_lag_s = lags.small;
  r.pi = d.rule == "magnitude_optimum"
             ? linear::magnitude_optimum(lags.gain, lags.large, lags.small)
             : linear::symmetric_optimum(lags.gain, lags.large, lags.small, d.symmetric_factor.value_or(2.0));
  const auto zeros = linear::transmission_zeros(s);
  if (!zeros.empty())
    r.warnings.push_back("the plant has a zero at " + linear::text_of(zeros.front()) +
                         ", of which the rule knows nothing");
  if (lags.small > lags.large / 4.0)
    r.warnings.push_back(
        "the small lags are more than a quarter of the large one: the rule is for plants where they are less");
}

void compare_loops(DesignResult& r) {
  if (r.pi) {
    add(r, "PI", linear::pi_loop(r.plant, r.pi->gain, r.pi->integral_time_s), 1);
    if (r.pi->prefilter_s > 0.0)
      add(r, "PI, prefilter", linear::pi_loop(r.plant, r.pi->gain, r.pi->integral_time_s, r.pi->prefilter_s), 1);
  } else if (r.controller) {
    const Matrix& K = r.controller->K;
    const auto p = r.plant.outputs();
    add(r, "open loop", linear::open_loop(r.plant), r.plant.inputs());
    add(r, "feedback alone", linear::feedback_loop(r.plant, K), r.plant.inputs());
    if (r.reference) add(r, "reference gain", linear::referenced_loop(r.plant, K, spread(r)), p);
    if (r.reference && r.observer)
      add(r, "with observer", linear::observed_loop(r.plant, K, spread(r), r.observer->L), p);
    if (r.integral)
      add(r, "integral action", linear::integral_loop(tracked_plant(r), r.integral->K),
          static_cast<Eigen::Index>(r.tracked.size()));
  }
  if (r.loops.empty()) return;
  if (!(r.at_Hz > 0.0)) {
    const auto modes = linear::modes_of(r.loops[std::min<std::size_t>(1, r.loops.size() - 1)].system);
    if (!modes.empty() && std::isfinite(modes.front().frequency_rad_s))
      r.at_Hz = modes.front().frequency_rad_s / two_pi;
  }
  const auto pairs = r.pi ? Eigen::Index{1} : std::min(static_cast<Eigen::Index>(r.tracked.size()), r.plant.inputs());
  for (Eigen::Index pair = 0; pair < pairs; ++pair) {
    for (std::size_t loop = 0; loop < r.loops.size(); ++loop) r.rows.push_back(row_of(r, loop, pair));
  }
}

}  // namespace slipbench
