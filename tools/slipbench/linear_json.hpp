// JSON of `analyse` and `design`. Numbers that do not exist are null.
#pragma once

#include <string>

namespace slipbench {

struct Analysis;
struct DesignResult;
struct DriveDesign;
struct EstimatorMap;
struct ObservabilityMap;

std::string linear_json(const Analysis& analysis);
std::string linear_json(const DesignResult& design);
std::string linear_json(const DriveDesign& design, const std::string& title);
std::string linear_json(const ObservabilityMap& map);
std::string linear_json(const EstimatorMap& map);

}  // namespace slipbench
