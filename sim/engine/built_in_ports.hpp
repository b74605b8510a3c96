// The built-in methods as ports over any number type, loaded from setups that were prepared before.
#pragma once

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/engine/ports.hpp"
#include "sim/engine/side_by_side.hpp"
#include "sim/engine/single_ports.hpp"

namespace slipbench {

namespace detail {

template <class Real, class Method>
struct Loaded {
  typename Method::template Constants<Real> constants;
  typename Method::template State<Real> state;

  // `numbers(setup)` gives one lane's MethodNumbers.
  template <class Get>
  Loaded(Cases cases, Get numbers) {
    side_by_side<Real>(
        constants, cases, [&](const RunSetup& s) -> const auto& { return numbers(s).constants; });
    side_by_side<Real>(
        state, cases, [&](const RunSetup& s) -> const auto& { return numbers(s).state; });
  }
};

}  // namespace detail

template <class Real, class Method>
class BuiltInEstimator final : public EstimatorPortOf<Real> {
 public:
  template <class Get>
  BuiltInEstimator(Cases cases, Get numbers) : method_(cases, numbers) {}
  // Whole in one function: the tick is made of many small ones.
  [[gnu::flatten]] Estimate<Real> step(const Sample<Real>& sample) override {
    return Method::template step<Real>(method_.state, sample, method_.constants);
  }
  void save(std::vector<double>& to, std::size_t lane) const override { apart<Real>(method_.state, lane, to); }

 private:
  detail::Loaded<Real, Method> method_;
};

template <class Real, class Method>
class BuiltInController final : public ControllerPortOf<Real> {
 public:
  template <class Get>
  BuiltInController(Cases cases, Get numbers) : method_(cases, numbers) {}
  [[gnu::flatten]] Command<Real> step(const Measurement<Real>& m) override {
    return Method::template step<Real>(method_.state, m, method_.constants);
  }
  void save(std::vector<double>& to, std::size_t lane) const override { apart<Real>(method_.state, lane, to); }

 private:
  detail::Loaded<Real, Method> method_;
};

template <class Real>
std::shared_ptr<EstimatorPortOf<Real>> load_estimator(Cases cases, std::size_t which) {
  std::shared_ptr<EstimatorPortOf<Real>> port;
  const MethodShape& wanted = cases[0]->shape.control.estimators[which];
  int index = 0;
  each_estimator_method([&]<class Method>() {
    const auto numbers = [which](const RunSetup& s) -> const MethodNumbers& { return s.estimators[which]; };
    if (index++ != wanted.index) return;
    if (wanted.single)
      port = std::make_shared<SingleEstimator<Real, Method>>(cases, numbers);
    else
      port = std::make_shared<BuiltInEstimator<Real, Method>>(cases, numbers);
  });
  return port;
}

template <class Real>
std::shared_ptr<ControllerPortOf<Real>> load_controller(Cases cases) {
  std::shared_ptr<ControllerPortOf<Real>> port;
  const MethodShape& wanted = cases[0]->shape.control.controller;
  int index = 0;
  each_controller_method([&]<class Method>() {
    const auto numbers = [](const RunSetup& s) -> const MethodNumbers& { return s.controller; };
    if (index++ != wanted.index) return;
    if (wanted.single)
      port = std::make_shared<SingleController<Real, Method>>(cases, numbers);
    else
      port = std::make_shared<BuiltInController<Real, Method>>(cases, numbers);
  });
  return port;
}

}  // namespace slipbench
