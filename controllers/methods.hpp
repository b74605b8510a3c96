// The list of built-in controllers: adding one takes its file pair and a line here.
#pragma once

#include <tuple>

#include "controllers/rotor_flux_oriented.hpp"
#include "controllers/state_feedback.hpp"
#include "controllers/volts_per_hertz.hpp"

namespace slipbench {

using ControllerMethods = std::tuple<RotorFluxOriented, VoltsPerHertz, StateFeedback>;

template <class F>
void each_controller_method(F&& f) {
  [&]<class... Method>(std::tuple<Method...>*) {
    (f.template operator()<Method>(), ...);
  }(static_cast<ControllerMethods*>(nullptr));
}

}  // namespace slipbench
