// The list of built-in estimators: adding one takes its file pair and a line here.
#pragma once

#include <tuple>

#include "estimators/extended_kalman.hpp"
#include "estimators/linear_observer.hpp"
#include "estimators/luenberger.hpp"
#include "estimators/reduced_order.hpp"

namespace slipbench {

using EstimatorMethods = std::tuple<Luenberger, ReducedOrder, ExtendedKalman, LinearObserver>;

// Calls f.template operator()<Method>() for each built-in method.
template <class F>
void each_estimator_method(F&& f) {
  [&]<class... Method>(std::tuple<Method...>*) {
    (f.template operator()<Method>(), ...);
  }(static_cast<EstimatorMethods*>(nullptr));
}

// Those that find the speed themselves.
template <class F>
void each_sensorless_method(F&& f) {
  each_estimator_method([&]<class Method>() {
    if constexpr (!requires { Method::needs_speed; }) f.template operator()<Method>();
  });
}

}  // namespace slipbench
