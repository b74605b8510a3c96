// The manual page, in the man(7) macros of roff, from the tables of verbs, options and exit statuses.
#pragma once

#include <string>

namespace slipbench {

std::string man_page();

}  // namespace slipbench
