// Where the engine meets estimators and controllers: types erased once, at one virtual call a tick each.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "controllers/control.hpp"
#include "estimators/method.hpp"

namespace slipbench {

class EstimatorPort {
 public:
  virtual ~EstimatorPort() = default;
  virtual Estimate<double> step(const Sample<double>& sample) = 0;
};

class ControllerPort {
 public:
  virtual ~ControllerPort() = default;
  virtual Command<double> step(const Measurement<double>& measurement) = 0;
};

// `kind` is one of those built in (the reader has checked); prepares constants and the state at tick 0.
std::unique_ptr<EstimatorPort> make_estimator(const std::string& kind, const EstimatorSetup& setup,
                                              const Settings& settings);
std::unique_ptr<ControllerPort> make_controller(const std::string& kind, const ControllerSetup& setup,
                                                const Settings& settings);

}  // namespace slipbench
