// From a scenario to the gains of its current loop and observer, and to a gain file that a scenario includes.
//
// What is designed for: the machine as the scenario believes it, its control period, delay and rated speed; weights as the settings
// of state_feedback say (the scenario's own where it has that controller), changed by the options. Gains are those that the
// controller would design for itself: a run that includes the file gives the same bits. A linear_observer that includes it gets the
// controller's observer (flux noise by the flux reference), where its own design takes the nameplate's flux.
#pragma once

#include <optional>

#include "plant/linear/system.hpp"
#include "sim/scenario/gain_file.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct DriveDesignOptions {
  std::optional<double> current_bandwidth_Hz, integral_bandwidth_Hz, faster_than_controller;
  std::optional<bool> integral_action;
  bool observer = true;  // gains for it too
};

// The loop at one speed.
struct DriveDesignPoint {
  double frequency_Hz = 0.0;
  std::vector<linear::Complex> poles;      // of the current loop, discrete
  double residual = 0.0, condition = 1.0;  // of the Riccati equation
  std::string warning;
};

struct DriveDesign {
  Settings controller, estimator;  // tables and the numbers they belong to
  std::vector<DriveDesignPoint> points;
  GainFile file;  // gain_file_text(file) is what to write
};

// InputError where the scenario has no inverter or no gain can be designed.
DriveDesign design_drive(const Scenario& scenario, const DriveDesignOptions& options = {});

}  // namespace slipbench
