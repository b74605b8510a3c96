// Where the engine meets estimators and controllers: types erased once, at one virtual call a tick each; one port steps one
// case (double) or a pack of them.
#pragma once

#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "controllers/control.hpp"
#include "estimators/method.hpp"
#include "sim/engine/setup.hpp"

namespace slipbench {

template <class Real>
class EstimatorPortOf {
 public:
  virtual ~EstimatorPortOf() = default;
  virtual Estimate<Real> step(const Sample<Real>& sample) = 0;
  // One lane's state, flat; built-in methods only.
  virtual void save(std::vector<double>&, std::size_t) const {}
};

template <class Real>
class ControllerPortOf {
 public:
  virtual ~ControllerPortOf() = default;
  virtual Command<Real> step(const Measurement<Real>& measurement) = 0;
  virtual void save(std::vector<double>&, std::size_t) const {}
};

using EstimatorPort = EstimatorPortOf<double>;
using ControllerPort = ControllerPortOf<double>;

// Adds to `run` the numbers of a method, prepared, with its state at the first tick. `kind` is built in or was added (the
// reader has checked). `single`: stepped in float; std::invalid_argument for a kind that is not built in.
void prepare_estimator(RunSetup& run, const std::string& kind, const EstimatorSetup& setup, const Settings& settings,
                       bool single);
void prepare_controller(RunSetup& run, const std::string& kind, const ControllerSetup& setup, const Settings& settings,
                        bool single);

bool is_built_in_estimator(std::string_view kind);
bool is_built_in_controller(std::string_view kind);

// Makers of kinds that are not built in; own_methods.hpp is the door.
using EstimatorMaker = std::unique_ptr<EstimatorPort> (*)(const EstimatorSetup&, const Settings&);
using ControllerMaker = std::unique_ptr<ControllerPort> (*)(const ControllerSetup&, const Settings&);
void add_estimator_maker(std::string_view kind, EstimatorMaker make);
void add_controller_maker(std::string_view kind, ControllerMaker make);

}  // namespace slipbench
