#include "tools/slipbench/design_result.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "plant/linear/place.hpp"

namespace slipbench {

namespace {

using linear::LinearError;
using linear::Matrix;
using linear::System;

constexpr Eigen::Index swept_order = 30;  // seven placements more; of larger ones each takes seconds
constexpr double usual_factor = 4.0;      // 2 to 5 is common practice

System chosen_inputs(const System& s, const std::vector<Eigen::Index>& inputs) {
  System out = s;
  const auto m = static_cast<Eigen::Index>(inputs.size());
  out.B.resize(s.order(), m), out.D.resize(s.outputs(), m);
  out.input_names.clear();
  for (Eigen::Index j = 0; j < m; ++j) {
    const Eigen::Index from = inputs[static_cast<std::size_t>(j)];
    out.B.col(j) = s.B.col(from), out.D.col(j) = s.D.col(from);
    out.input_names.push_back(s.input_name(from));
  }
  return out;
}

System chosen_outputs(const System& s, const std::vector<Eigen::Index>& outputs) {
  System out = s;
  const auto p = static_cast<Eigen::Index>(outputs.size());
  out.C.resize(p, s.order()), out.D.resize(p, s.inputs());
  out.output_names.clear();
  for (Eigen::Index i = 0; i < p; ++i) {
    const Eigen::Index from = outputs[static_cast<std::size_t>(i)];
    out.C.row(i) = s.C.row(from), out.D.row(i) = s.D.row(from);
    out.output_names.push_back(s.output_name(from));
  }
  return out;
}

Matrix identity(Eigen::Index n) { return Matrix::Identity(n, n); }

void warn(DesignResult& r, const std::string& of, const std::string& warning) {
  if (!warning.empty()) r.warnings.push_back(of + ": " + warning);
}

linear::StateFeedback controller_of(DesignResult& r, const DesignRequest& d) {
  if (d.kind == DesignKind::place) return linear::place(r.plant, d.poles);
  if (!d.controller_poles.empty()) {
    r.controller_from = "placed at design.controller_poles";
    return linear::place(r.plant, d.controller_poles);
  }
  if (d.has_weights()) {
    r.controller_from = "LQR of design.Q and design.R";
    return linear::lqr(r.plant, d.Q, d.R, d.N);
  }
  r.controller_from = "LQR of unit weights, for [design] names none";
  return linear::lqr(r.plant, identity(r.plant.order()), identity(r.plant.inputs()));
}

linear::Observer observer_of(DesignResult& r, const DesignRequest& d) {
  const std::vector<linear::Complex>& poles = d.kind == DesignKind::observer ? d.poles : d.observer_poles;
  if (!poles.empty()) {
    r.observer_from = "placed";
    return linear::observer_by_poles(r.plant, poles);
  }
  if (d.V.size() > 0) {
    r.observer_from = "stationary Kalman of design.W and design.V";
    return linear::stationary_kalman(r.plant, d.W, d.V);
  }
  const double factor = d.faster_than_controller.value_or(usual_factor);
  r.observer_from = fmt::format("{:g} times faster than the controller{}", factor,
                                d.faster_than_controller ? "" : ", for [design] names no factor");
  return linear::observer_faster_than(r.plant, r.controller->K, factor);
}

// K over [x; z], z the integrals of the tracked outputs' errors.
linear::StateFeedback integral_of(const DesignResult& r, const DesignRequest& d) {
  const auto n = r.plant.order(), q = d.Q_integral.rows();
  Matrix Q = Matrix::Zero(n + q, n + q);
  Q.topLeftCorner(n, n) = d.Q, Q.bottomRightCorner(q, q) = d.Q_integral;
  return linear::lqr_with_integral(chosen_outputs(r.plant, d.tracked), Q, d.R);
}

void add_reference_gain(DesignResult& r) {
  const auto inputs = r.plant.inputs();
  if (static_cast<Eigen::Index>(r.tracked.size()) != inputs) {
    r.notes.push_back(
        fmt::format("no reference gain: {} controlled input{} for {} tracked output{}; as many are needed "
                    "(design.controlled_inputs, design.tracked_outputs)",
                    inputs, inputs == 1 ? "" : "s", r.tracked.size(), r.tracked.size() == 1 ? "" : "s"));
    return;
  }
  try {
    r.reference = linear::reference_gain(chosen_outputs(r.plant, r.tracked), r.controller->K);
    warn(r, "reference gain", r.reference->warning);
  } catch (const LinearError& error) {
    r.notes.push_back(std::string("no reference gain: ") + error.what());
  }
}

void add_factors(DesignResult& r, const DesignRequest& d) {
  std::vector<double> factors = {1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 8.0};
  if (d.faster_than_controller && std::count(factors.begin(), factors.end(), *d.faster_than_controller) == 0)
    factors.push_back(*d.faster_than_controller);
  std::sort(factors.begin(), factors.end());
  try {
    for (const linear::FactorCost& cost : linear::sweep_factor(r.plant, r.controller->K, factors, d.V))
      r.factors.push_back({cost.factor, cost.slowest_s, cost.rms});
  } catch (const LinearError& error) {
    r.notes.push_back(std::string("no sweep of the observer's factor: ") + error.what());
  }
}

// Where poles can't be moved, a filter of unit noises still has its say about the others.
void add_filter(DesignResult& r, const std::string& why) {
  try {
    r.observer = linear::stationary_kalman(r.plant, identity(r.plant.order()), identity(r.plant.outputs()));
    r.observer_from = "stationary Kalman of unit noises, for its poles can't be placed";
    r.notes.push_back("no observer by poles: " + why);
  } catch (const LinearError& error) {
    r.notes.push_back(std::string("no observer beside the controller: ") + error.what());
  }
}

// What was asked for may fail the request; what stands beside it for comparison is left out with a note.
void design_gains(DesignResult& r, const DesignRequest& d) {
  if (!r.is_observer()) {
    r.controller = controller_of(r, d);
    warn(r, "controller", r.controller->warning);
    if (d.Q_integral.size() > 0) {
      r.integral = integral_of(r, d);
      warn(r, "integral action", r.integral->warning);
    }
  } else {
    const bool needed = d.has_weights() || !d.controller_poles.empty() || d.faster_than_controller;
    try {
      r.controller = controller_of(r, d);
    } catch (const LinearError& error) {
      if (needed) throw;
      r.notes.push_back(std::string("no controller beside the observer: ") + error.what());
    }
  }
  const bool asked = r.is_observer() || !d.observer_poles.empty() || d.faster_than_controller || d.V.size() > 0;
  if (r.controller || !d.poles.empty() || d.V.size() > 0) {
    try {
      r.observer = observer_of(r, d);
      warn(r, "observer", r.observer->warning);
    } catch (const LinearError& error) {
      if (asked) throw;
      add_filter(r, error.what());
    }
  }
  if (!r.controller) return;
  add_reference_gain(r);
  if (r.plant.outputs() > 0 && r.plant.order() <= swept_order) add_factors(r, d);
  if (r.observer) r.separation = linear::separation(r.plant, r.controller->K, r.observer->L);
}

}  // namespace

DesignResult design(const SystemFile& file, double at_Hz) {
  if (!file.design)
    throw InputError(
        file.path, "design",
        "design wants a table [design] in the file, as in kind = \"lqr\", Q and R; or --set design.kind=...",
        "missing");
  const DesignRequest& d = *file.design;
  DesignResult r;
  r.title = file.title, r.file = file.path;
  r.kind = d.kind;
  r.at_Hz = at_Hz;
  try {
    if (d.kind == DesignKind::pi) {
      r.plant = file.system;
      design_pi(r, d);
    } else {
      r.plant = chosen_inputs(file.system, d.controlled);
      r.tracked = d.tracked;
      design_gains(r, d);
    }
    compare_loops(r);
  } catch (const LinearError& error) {
    throw InputError(d.place, "design", error.what(), "linear");
  }
  return r;
}

}  // namespace slipbench
