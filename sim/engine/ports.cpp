#include "sim/engine/ports.hpp"

#include <stdexcept>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"

namespace slipbench {

namespace {

template <class Method>
class BuiltInEstimator final : public EstimatorPort {
 public:
  BuiltInEstimator(const EstimatorSetup& setup, const Settings& settings)
      : constants_(Method::prepare(setup, settings)), state_(Method::begin(setup, constants_)) {}
  // Whole in one function: the tick is made of many small ones.
  [[gnu::flatten]] Estimate<double> step(const Sample<double>& sample) override {
    return Method::template step<double>(state_, sample, constants_);
  }

 private:
  typename Method::template Constants<double> constants_;
  typename Method::template State<double> state_;
};

template <class Method>
class BuiltInController final : public ControllerPort {
 public:
  BuiltInController(const ControllerSetup& setup, const Settings& settings)
      : constants_(Method::prepare(setup, settings)), state_(Method::begin(setup, constants_)) {}
  [[gnu::flatten]] Command<double> step(const Measurement<double>& m) override {
    return Method::template step<double>(state_, m, constants_);
  }

 private:
  typename Method::template Constants<double> constants_;
  typename Method::template State<double> state_;
};

}  // namespace

std::unique_ptr<EstimatorPort> make_estimator(const std::string& kind, const EstimatorSetup& setup,
                                              const Settings& settings) {
  std::unique_ptr<EstimatorPort> port;
  each_estimator_method([&]<class Method>() {
    if (kind == Method::kind) port = std::make_unique<BuiltInEstimator<Method>>(setup, settings);
  });
  if (!port) throw std::logic_error("no estimator of kind " + kind);
  return port;
}

std::unique_ptr<ControllerPort> make_controller(const std::string& kind, const ControllerSetup& setup,
                                                const Settings& settings) {
  std::unique_ptr<ControllerPort> port;
  each_controller_method([&]<class Method>() {
    if (kind == Method::kind) port = std::make_unique<BuiltInController<Method>>(setup, settings);
  });
  if (!port) throw std::logic_error("no controller of kind " + kind);
  return port;
}

}  // namespace slipbench
