#include "sim/scenario/keys.hpp"

#include <type_traits>
#include <utility>

namespace slipbench {
namespace {

// Words, choices and counts are structural by nature.
struct IsStructural {
  bool operator()(const MethodSetting& method) const { return method.setting->structural; }
  template <class T>
  bool operator()(T& (*)(Scenario&, std::size_t)) const {
    return std::is_same_v<T, std::string> || std::is_integral_v<T>;
  }
};

}  // namespace

const std::vector<Key>& scenario_keys() {
  static const std::vector<Key> table = [] {
    std::vector<Key> keys;
    plant_keys(keys);
    drive_keys(keys);
    for (Key& key : method_keys()) keys.push_back(std::move(key));
    for (Key& key : keys) key.structural = key.structural || std::visit(IsStructural{}, key.slot);
    return keys;
  }();
  return table;
}

}  // namespace slipbench
