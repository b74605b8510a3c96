/* Instructions of a tick on QEMU's mps2-an386 under `-icount shift=7`, from its timer. Instructions are not clocks. */
#ifndef SLIPBENCH_FIRMWARE_PORT_COUNT_H
#define SLIPBENCH_FIRMWARE_PORT_COUNT_H

#include "sim/board/frames.h"
#include "tools/firmware/port.h"
#include "tools/firmware/timer.h"

const uint8_t port_used_unit = BOARD_USED_INSTRUCTIONS;
const uint32_t port_clock_Hz = 25000000u;

static uint32_t use_begun, use_around;

/* The timer stands still outside: a core asleep beside a running timer keeps QEMU leaping from one of its ends to the next. */
static void timer_run(uint32_t on) { TIMER->control = on; }

void port_use_begin(void) {
  timer_run(1u);
  use_begun = timer_value();
}
uint32_t port_use_end(void) {
  const uint32_t used = instructions_of(use_begun - timer_value());
  timer_run(0u);
  return used - use_around;
}

/* What the two calls cost themselves. */
static void use_calibrate(void) {
  timer_start();
  timer_run(0u);
  port_use_begin();
  use_around = port_use_end();
}

#endif
