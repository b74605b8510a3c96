#include "sim/engine/ports.hpp"

#include <stdexcept>
#include <utility>
#include <vector>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/engine/method_ports.hpp"
#include "sim/engine/side_by_side.hpp"

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

// What a setting that is a choice is set to; one that was left to the method is told apart from any number.
void note_choices(std::span<const Setting> table, const Settings& given, std::vector<double>& choices) {
  for (const Setting& setting : table) {
    if (!setting.structural) continue;
    const double value = given.value(setting.name, setting.fallback);
    const bool set = value == value;
    choices.push_back(set ? 1.0 : 0.0);
    choices.push_back(set ? value : 0.0);
  }
}

template <class Method, class Setup>
void prepare(int index, const Setup& setup, const Settings& settings, MethodShape& shape, MethodNumbers& numbers) {
  const auto constants = Method::prepare(setup, settings);
  const auto state = Method::begin(setup, constants);
  shape.index = index;
  note_choices(Method::settings, settings, shape.choices);
  apart<double>(constants, 0, numbers.constants);
  apart<double>(state, 0, numbers.state);
}

[[noreturn]] void refuse_single(const std::string& kind) {
  throw std::invalid_argument("precision = \"float\" is for the kinds built in, and \"" + kind +
                              "\" was added by this program: leave it at \"double\"");
}

}  // namespace

void prepare_estimator(RunSetup& run, const std::string& kind, const EstimatorSetup& setup, const Settings& settings,
                       bool single) {
  MethodShape shape;
  shape.single = single;
  MethodNumbers numbers;
  std::shared_ptr<EstimatorPort> own;
  int index = 0;
  each_estimator_method([&]<class Method>() {
    if (kind == Method::kind) prepare<Method>(index, setup, settings, shape, numbers);
    ++index;
  });
  for (const auto& [name, make] : own_makers().estimators) {
    if (kind == name) own = make(setup, settings);
  }
  if (shape.index < 0 && !own) throw std::logic_error("no estimator of kind " + kind);
  if (own && single) refuse_single(kind);
  run.shape.control.estimators.push_back(std::move(shape));
  run.estimators.push_back(std::move(numbers));
  run.own_estimators.push_back(std::move(own));
}

void prepare_controller(RunSetup& run, const std::string& kind, const ControllerSetup& setup, const Settings& settings,
                        bool single) {
  run.shape.control.controller.single = single;
  int index = 0;
  each_controller_method([&]<class Method>() {
    if (kind == Method::kind) prepare<Method>(index, setup, settings, run.shape.control.controller, run.controller);
    ++index;
  });
  for (const auto& [name, make] : own_makers().controllers) {
    if (kind == name) run.own_controller = make(setup, settings);
  }
  if (run.shape.control.controller.index < 0 && !run.own_controller)
    throw std::logic_error("no controller of kind " + kind);
  if (run.own_controller && single) refuse_single(kind);
}

bool is_built_in_estimator(std::string_view kind) {
  bool found = false;
  each_estimator_method([&]<class Method>() { found = found || kind == Method::kind; });
  return found;
}
bool is_built_in_controller(std::string_view kind) {
  bool found = false;
  each_controller_method([&]<class Method>() { found = found || kind == Method::kind; });
  return found;
}

void add_estimator_maker(std::string_view kind, EstimatorMaker make) {
  own_makers().estimators.emplace_back(kind, make);
}
void add_controller_maker(std::string_view kind, ControllerMaker make) {
  own_makers().controllers.emplace_back(kind, make);
}

}  // namespace slipbench
