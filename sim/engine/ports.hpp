// Where the engine meets estimators and controllers: types erased once, at one virtual call a tick each.
#pragma once

#include <memory>
#include <string>
#include <string_view>
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

// `kind` is built in or was added (the reader has checked); prepares constants and the state at tick 0.
std::unique_ptr<EstimatorPort> make_estimator(const std::string& kind, const EstimatorSetup& setup,
                                              const Settings& settings);
std::unique_ptr<ControllerPort> make_controller(const std::string& kind, const ControllerSetup& setup,
                                                const Settings& settings);

// Makers of kinds that are not built in; own_methods.hpp is the door.
using EstimatorMaker = std::unique_ptr<EstimatorPort> (*)(const EstimatorSetup&, const Settings&);
using ControllerMaker = std::unique_ptr<ControllerPort> (*)(const ControllerSetup&, const Settings&);
void add_estimator_maker(std::string_view kind, EstimatorMaker make);
void add_controller_maker(std::string_view kind, ControllerMaker make);

}  // namespace slipbench
