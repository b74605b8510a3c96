// JSON of `analyse` and `design`. Numbers that do not exist are null.
#pragma once

#include <string>

namespace slipbench {

struct Analysis;
struct DesignResult;

std::string linear_json(const Analysis& analysis);
std::string linear_json(const DesignResult& design);

}  // namespace slipbench
