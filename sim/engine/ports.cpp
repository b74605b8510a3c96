#include "sim/engine/ports.hpp"

#include <stdexcept>
#include <utility>
#include <vector>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/engine/method_ports.hpp"

namespace slipbench {

namespace {

struct OwnMakers {
  std::vector<std::pair<std::string_view, EstimatorMaker>> estimators;
  std::vector<std::pair<std::string_view, ControllerMaker>> controllers;
};
OwnMakers& own_makers() {
  static OwnMakers makers;
  return makers;
}

}  // namespace

std::unique_ptr<EstimatorPort> make_estimator(const std::string& kind, const EstimatorSetup& setup,
                                              const Settings& settings) {
  std::unique_ptr<EstimatorPort> port;
  each_estimator_method([&]<class Method>() {
    if (kind == Method::kind) port = std::make_unique<MethodEstimator<Method>>(setup, settings);
  });
  for (const auto& [own, make] : own_makers().estimators) {
    if (kind == own) port = make(setup, settings);
  }
  if (!port) throw std::logic_error("no estimator of kind " + kind);
  return port;
}

std::unique_ptr<ControllerPort> make_controller(const std::string& kind, const ControllerSetup& setup,
                                                const Settings& settings) {
  std::unique_ptr<ControllerPort> port;
  each_controller_method([&]<class Method>() {
    if (kind == Method::kind) port = std::make_unique<MethodController<Method>>(setup, settings);
  });
  for (const auto& [own, make] : own_makers().controllers) {
    if (kind == own) port = make(setup, settings);
  }
  if (!port) throw std::logic_error("no controller of kind " + kind);
  return port;
}

void add_estimator_maker(std::string_view kind, EstimatorMaker make) {
  own_makers().estimators.emplace_back(kind, make);
}
void add_controller_maker(std::string_view kind, ControllerMaker make) {
  own_makers().controllers.emplace_back(kind, make);
}

}  // namespace slipbench
