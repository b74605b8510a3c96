// Rows that the methods bring: gathered in this one unit, so that the methods' templates are compiled once here.
#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/scenario/keys.hpp"

namespace slipbench {
namespace {

template <class Method>
void add_rows(std::vector<Key>& rows, const std::string& table, Settings& (*of)(Scenario&, std::size_t)) {
  for (const Setting& s : Method::settings) {
    const bool derives = s.fallback != s.fallback;
    rows.push_back({.path = table + "." + std::string(s.name),
                    .slot = MethodSetting{&s, of},
                    .unit = s.unit,
                    .range = {s.low, s.high},
                    .when = {Method::kind},
                    .otherwise = derives ? std::string_view("derived from nameplate and sensors") : std::string_view(),
                    .meaning = s.meaning});
  }
}

}  // namespace

std::vector<Key> method_keys() {
  std::vector<Key> rows;
  each_controller_method([&]<class Method>() {
    add_rows<Method>(rows, "controller", [](Scenario& s, std::size_t) -> Settings& { return s.controller.settings; });
  });
  each_estimator_method([&]<class Method>() {
    add_rows<Method>(rows, "estimator[]",
                     [](Scenario& s, std::size_t i) -> Settings& { return s.estimators[i].settings; });
  });
  return rows;
}

const std::vector<std::string_view>& estimator_kinds() {
  static const std::vector<std::string_view> kinds = [] {
    std::vector<std::string_view> k;
    each_estimator_method([&]<class Method>() { k.push_back(Method::kind); });
    return k;
  }();
  return kinds;
}

const std::vector<std::string_view>& controller_kinds() {
  static const std::vector<std::string_view> kinds = [] {
    std::vector<std::string_view> k;
    each_controller_method([&]<class Method>() { k.push_back(Method::kind); });
    return k;
  }();
  return kinds;
}

}  // namespace slipbench
