// Opens a link to a board from what the command line says.
//
//   pipe:COMMAND          a process started here, frames over its standard input and output
//   unix:PATH             a Unix stream socket on which the board listens
//   serial:DEVICE[@BAUD]  a serial device, raw, 8N1; a pseudo-terminal too (without BAUD the device's rate stays)
//   host                  the firmware of this build as a process of this computer
//   emulated              the firmware of this build on a Cortex-M4F under QEMU, frames over semihosting
//   emulated_uart         the same over the emulated UART
#pragma once

#include <memory>
#include <string>
#include <string_view>

#include "sim/board/link.hpp"

namespace slipbench {

// Where the firmware of this build lies: NAME_host, NAME_semihosting.elf, NAME_uart.elf.
struct FirmwareFiles {
  std::string host, semihosting, uart;
};

// Throws InputError (place "command line", key --link) for what is no link, OutsideError for one that cannot be opened.
std::unique_ptr<Link> open_link(const std::string& link, const FirmwareFiles& firmware);

// Baud of a serial link as given, else 0.
long baud_of(std::string_view link);
// Started here, so that host and board never run at once and gain from one core.
bool started_here(std::string_view link);

}  // namespace slipbench
