// What `design` found: gains, how far to trust them, and the loops they make, compared.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "plant/linear/combined.hpp"
#include "plant/linear/kalman.hpp"
#include "plant/linear/lqr.hpp"
#include "plant/linear/observer.hpp"
#include "plant/linear/pi_tuning.hpp"
#include "plant/linear/reference_gain.hpp"
#include "plant/linear/step_figures.hpp"
#include "sim/scenario/system_file.hpp"
#include "tools/slipbench/time_grid.hpp"

namespace slipbench {

// One closed loop. Inputs, first the references (or plain inputs), then the disturbances d and measurement noises v.
struct Loop {
  std::string name;
  linear::System system;
  Eigen::Index references = 0;  // how many of its inputs come before d
  bool stable = false;
  std::string verdict;  // names the deciding mode
};

// A loop's answer to one reference (input) at the output that belongs to it.
struct LoopRow {
  std::size_t loop = 0;
  Eigen::Index pair = 0;                    // n-th tracked output
  std::optional<linear::StepFigures> step;  // none unless stable
  std::optional<double> effort, dip, left;  // largest |u|; after a unit disturbance: largest |y|, and what stays
  std::optional<double> noise;              // rms of u per unit white noise on every measurement; 0 without an observer
  std::optional<double> gain, phase_deg;    // from reference to output at the asked frequency
};

// Where the n-th tracked output's reference (input) enters a loop, and where the output shows.
struct LoopPort {
  Eigen::Index input = 0, output = 0;
};

struct FactorRow {
  double factor = 0.0, slowest_s = 0.0;
  linear::Vector rms;  // each state, per unit noise on every output
};

struct DesignResult {
  std::string title, file;
  DesignKind kind = DesignKind::lqr;
  linear::System plant;                             // of the controlled inputs; all outputs are measured
  std::vector<Eigen::Index> tracked;                // outputs that references are for
  std::optional<linear::StateFeedback> controller;  // kinds lqr and place; beside observers
  std::optional<linear::StateFeedback> integral;    // K over [x; z]
  std::optional<linear::Observer> observer;         // kinds observer and kalman; beside controllers
  std::string controller_from, observer_from;       // how the one beside came about
  std::optional<linear::ReferenceGain> reference;
  std::optional<linear::PiTuning> pi;
  double pi_gain = 0.0, pi_large_lag_s = 0.0, pi_small_lag_s = 0.0;  // what the rule was given
  std::optional<linear::Separation> separation;
  std::vector<FactorRow> factors;
  std::vector<Loop> loops;
  std::vector<LoopRow> rows;
  double at_Hz = 0.0;
  std::vector<std::string> notes, warnings;  // what could not be had, and why; what not to trust

  [[nodiscard]] bool is_observer() const { return kind == DesignKind::observer || kind == DesignKind::kalman; }
};

// at_Hz 0: at the loop's own slowest mode. Throws InputError at [design] where the request can't be met.
DesignResult design(const SystemFile& file, double at_Hz);

LoopPort port_of(const DesignResult& result, const Loop& loop, Eigen::Index pair);
// The loops and their rows.
void compare_loops(DesignResult& result);
// kind pi. LinearError.
void design_pi(DesignResult& result, const DesignRequest& request);

std::string design_report(const DesignResult& result);
std::string design_figure(const DesignResult& result);  // SVG

}  // namespace slipbench
