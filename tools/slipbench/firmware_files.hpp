// The sources of tools/firmware as they were built in, so that an installed command can compile for the emulated board.
#pragma once

#include <span>
#include <string_view>

namespace slipbench {

struct EmbeddedFile {
  std::string_view name, text;
};

std::span<const EmbeddedFile> firmware_files();

}  // namespace slipbench
