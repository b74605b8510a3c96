// Shell completion scripts, from the tables of verbs, options and scenario keys: a verb, that verb's options, files by
// their ending, after --set a key, after KEY= its words.
#pragma once

#include <string>

namespace slipbench {

std::string bash_completion();
std::string zsh_completion();

}  // namespace slipbench
