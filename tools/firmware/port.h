/* What a part must give: bytes in and out, the gate enable, a clock for the watchdog, a count of what a tick costs. One .c for
 * each way a board stands: port_host.c (a process), port_semihosting.c and port_uart.c (QEMU's mps2-an386). */
#ifndef SLIPBENCH_FIRMWARE_PORT_H
#define SLIPBENCH_FIRMWARE_PORT_H

#include <stddef.h>
#include <stdint.h>

extern const char port_name[];       /* of the board, at most 31 bytes */
extern const uint8_t port_used_unit; /* board_used_unit of sim/board/frames.h */
extern const uint32_t port_clock_Hz; /* 0: unknown */

void port_open(void);
/* Waits for bytes; at most `periods` control periods of this board's clock, 0: for ever. Returns how many came (up to `room`), 0 when
 * the time passed, -1 when there will be no more. */
int port_read(uint8_t* bytes, size_t room, uint32_t periods);
void port_write(const uint8_t* bytes, size_t count);
/* The gate enable line: 0 opens all six switches at once. */
void port_gates(int enabled);
/* Around a tick's computing; the second gives what it cost in port_used_unit. */
void port_use_begin(void);
uint32_t port_use_end(void);

#endif
