// A method as a port: constants and state of one estimator or controller behind its virtual call.
#pragma once

#include "sim/engine/ports.hpp"

namespace slipbench {

template <class Method>
class MethodEstimator final : public EstimatorPort {
 public:
  MethodEstimator(const EstimatorSetup& setup, const Settings& settings)
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
class MethodController final : public ControllerPort {
 public:
  MethodController(const ControllerSetup& setup, const Settings& settings)
      : constants_(Method::prepare(setup, settings)), state_(Method::begin(setup, constants_)) {}
  [[gnu::flatten]] Command<double> step(const Measurement<double>& m) override {
    return Method::template step<double>(state_, m, constants_);
  }

 private:
  typename Method::template Constants<double> constants_;
  typename Method::template State<double> state_;
};

}  // namespace slipbench
