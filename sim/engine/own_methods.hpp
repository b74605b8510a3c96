// Estimators and controllers of a program's own, beside those built in: from here on their kinds and settings are keys of
// a scenario, with ranges, errors and --set like all others.
//
//   namespace slipbench::mine {   // inside slipbench: exp, atan2, select, max mean its own, not the C library's
//   struct Mine { ... };          // the shape: estimators/method.hpp, controllers/control.hpp; step<double> is what runs
//   }
//   int main() {
//     slipbench::add_estimator<slipbench::mine::Mine>();                      // before the first scenario is read
//     const slipbench::Scenario s = slipbench::read_scenario("drive.toml");   // its kind is known here
//   }
//
// Call these first thing in main, from one thread, before any scenario is read, checked or run: nothing is locked. After
// that, reading and running from several threads is as safe as with the built-in kinds alone; each run has its own state.
// Throws std::logic_error, and adds nothing, once a scenario has been read, for a kind that is there already, and for
// settings that clash with other keys. A method must be pure (the same inputs, the same bits) and its step must not
// allocate, lock or throw; prepare and begin may throw, which ends the run before its first tick.
#pragma once

#include <concepts>

#include "sim/engine/method_ports.hpp"
#include "sim/scenario/keys.hpp"

#ifdef __FAST_MATH__
#error "slipbench gives the same bits everywhere: build without -ffast-math, with -ffp-contract=off"
#endif

namespace slipbench {

template <class M>
concept EstimatorMethod = requires(const EstimatorSetup& setup, const Settings& given, const Sample<double>& sample,
                                   typename M::template Constants<double> constants,
                                   typename M::template State<double> state) {
  { M::kind } -> std::convertible_to<std::string_view>;
  { M::settings } -> std::convertible_to<std::span<const Setting>>;
  { M::prepare(setup, given) } -> std::convertible_to<typename M::template Constants<double>>;
  { M::begin(setup, constants) } -> std::convertible_to<typename M::template State<double>>;
  { M::template step<double>(state, sample, constants) } -> std::same_as<Estimate<double>>;
};

template <class M>
concept ControllerMethod = requires(const ControllerSetup& setup, const Settings& given,
                                    const Measurement<double>& seen, typename M::template Constants<double> constants,
                                    typename M::template State<double> state) {
  { M::kind } -> std::convertible_to<std::string_view>;
  { M::settings } -> std::convertible_to<std::span<const Setting>>;
  { M::takes_speed } -> std::convertible_to<bool>;
  { M::prepare(setup, given) } -> std::convertible_to<typename M::template Constants<double>>;
  { M::begin(setup, constants) } -> std::convertible_to<typename M::template State<double>>;
  { M::template step<double>(state, seen, constants) } -> std::same_as<Command<double>>;
};

template <EstimatorMethod Method>
void add_estimator() {
  add_estimator_keys(Method::kind, Method::settings);
  add_estimator_maker(Method::kind, [](const EstimatorSetup& setup, const Settings& given) {
    return std::unique_ptr<EstimatorPort>(std::make_unique<MethodEstimator<Method>>(setup, given));
  });
}

template <ControllerMethod Method>
void add_controller() {
  add_controller_keys(Method::kind, Method::settings, Method::takes_speed);
  add_controller_maker(Method::kind, [](const ControllerSetup& setup, const Settings& given) {
    return std::unique_ptr<ControllerPort>(std::make_unique<MethodController<Method>>(setup, given));
  });
}

}  // namespace slipbench
