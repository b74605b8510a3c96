/* The board as a process of this computer: frames over standard input and output. */
#define _POSIX_C_SOURCE 200809L
#include <errno.h>
#include <poll.h>
#include <stdlib.h>
#include <unistd.h>

#include <board_drive.h> /* written at build time */
#include "sim/board/frames.h"
#include "tools/firmware/port.h"

const char port_name[] = "slipbench firmware, host";
const uint8_t port_used_unit = BOARD_USED_NOTHING;
const uint32_t port_clock_Hz = 0;

void port_open(void) {}

int port_read(uint8_t* bytes, size_t room, uint32_t periods) {
  const long wait_ms = (long)((uint64_t)periods * BOARD_CONTROL_PERIOD_NS / 1000000u) + 1;
  for (;;) {
    struct pollfd in = {0, POLLIN, 0};
    ssize_t came;
    if (periods > 0) {
      const int ready = poll(&in, 1, (int)wait_ms);
      if (ready == 0) return 0;
      if (ready < 0 && errno == EINTR) continue;
    }
    came = read(0, bytes, room);
    if (came > 0) return (int)came;
    if (came < 0 && errno == EINTR) continue;
    return -1;
  }
}

void port_write(const uint8_t* bytes, size_t count) {
  while (count > 0) {
    const ssize_t taken = write(1, bytes, count);
    if (taken > 0) {
      bytes += taken;
      count -= (size_t)taken;
    } else if (errno != EINTR) {
      exit(0); /* nobody listens any more */
    }
  }
}

void port_gates(int enabled) { (void)enabled; }
void port_use_begin(void) {}
uint32_t port_use_end(void) { return 0; }
