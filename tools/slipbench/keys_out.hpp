// The table of scenario keys as JSON documents: the table itself, and JSON Schemas (draft 7, as TOML editors read them) of
// scenario, machine and state-space files. The schemas hold what the table holds; relations between keys are for `check FILE` alone.
#pragma once

#include <string>

namespace slipbench {

std::string keys_document();  // {"keys": [...], "sections": [...]}
std::string scenario_schema();
std::string machine_schema();
std::string system_schema();

}  // namespace slipbench
