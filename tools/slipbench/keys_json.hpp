// Values of the table of keys as JSON.
#pragma once

#include <cmath>
#include <nlohmann/json.hpp>

#include "sim/scenario/reference.hpp"

namespace slipbench {

using Json = nlohmann::ordered_json;

inline Json default_json(const KeyReference::Value& value) {
  return std::visit(
      [](const auto& x) {
        if constexpr (std::is_same_v<std::decay_t<decltype(x)>, std::monostate>) {
          return Json(nullptr);
        } else {
          return Json(x);
        }
      },
      value);
}

// A bound: whole where it is, so that a schema says 100 and not 100.0.
inline Json bound_json(double x) {
  constexpr double exact = 9007199254740992.0;  // 2^53: whole numbers below it are themselves in double
  return x == std::floor(x) && std::fabs(x) < exact ? Json(static_cast<std::int64_t>(x)) : Json(x);
}

inline std::string json_text(const Json& document) {
  return document.dump(2, ' ', false, Json::error_handler_t::replace) + "\n";
}

}  // namespace slipbench
