// What a person reads of a map over the torque-speed plane, and which estimators have one.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "sim/linear/estimator_map.hpp"

namespace slipbench {

std::string map_report(const ObservabilityMap& map);
std::string map_report(const EstimatorMap& map);

// How many points of it are so.
struct MapCounts {
  std::size_t stable = 0, marginal = 0, unstable = 0, unsettled = 0;
};
MapCounts counts_of(const EstimatorMap& map);

std::vector<std::string_view> mapped_estimator_kinds();

}  // namespace slipbench
