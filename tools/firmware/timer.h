/* The CMSDK timer 0 of mps2-an386, 25 MHz, counting down for ever. Under `-icount shift=7` an instruction takes 128 ns of
 * virtual time, 3.2 counts: the instructions between two readings follow exactly. (DWT's cycle counter reads 0 in QEMU.) */
#ifndef TIMER_H
#define TIMER_H

#include <stdint.h>

struct timer {
  volatile uint32_t control, value, reload, interrupt;
};
#define TIMER ((struct timer *)0x40000000u)

static inline void timer_start(void) {
  TIMER->reload = 0xFFFFFFFFu;
  TIMER->value = 0xFFFFFFFFu;
  TIMER->control = 1u;
}
static inline uint32_t timer_value(void) { return TIMER->value; }
/* Of a difference of two readings, to the nearest: reading can be off by one count, an instruction is more than three. */
static inline uint32_t instructions_of(uint32_t counts) { return (counts * 10u + 16u) / 32u; }

#endif
