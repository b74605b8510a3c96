/* The emulated board by its UART 0 (CMSDK APB UART of mps2-an386). A real part: its own UART here, with the baud rate that
 * sim/board/README.md reckons, received by DMA or interrupt.
 *
 * The core sleeps until a byte is there (polling costs QEMU 6 ms now and then); interrupts stay masked, a pending one wakes it.
 * Asleep, QEMU's virtual time leaps to the next timer event: where silence is watched, the wait is spent awake. */
#include <board_drive.h> /* written at build time */
#include "tools/firmware/port_count.h"

const char port_name[] = "slipbench firmware, M4F UART";

struct uart {
  volatile uint32_t data, state, control, interrupt, divider;
};
#define UART ((struct uart*)0x40004000u)
enum {
  transmit_full = 1,
  receive_full = 2,
  transmit_on = 1,
  receive_on = 2,
  receive_interrupt = 8,
  receive_pending = 2
};

#define NVIC_ENABLE (*(volatile uint32_t*)0xE000E100u)
#define NVIC_UNPEND (*(volatile uint32_t*)0xE000E280u)
enum { uart_receive_line = 1 }; /* interrupt 0 */

void port_open(void) {
  __asm volatile("cpsid i" ::: "memory");
  use_calibrate();
  UART->divider = 16u; /* the fastest: QEMU keeps no baud rate */
  UART->control = transmit_on | receive_on | receive_interrupt;
  NVIC_ENABLE = uart_receive_line;
}

static int wait_for_byte(uint32_t periods) {
  uint32_t begun;
  int there = 1;
  /* 25 MHz: 25 counts a microsecond; up to 171 s */
  const uint64_t wanted = (uint64_t)periods * BOARD_CONTROL_PERIOD_NS / 40u;
  const uint32_t wait = wanted < 0xFFFFFFFFu ? (uint32_t)wanted : 0xFFFFFFFFu;
  if (periods == 0) {
    while ((UART->state & receive_full) == 0) __asm volatile("wfi" ::: "memory");
    return 1;
  }
  timer_run(1u);
  begun = timer_value();
  while (there && (UART->state & receive_full) == 0) there = begun - timer_value() < wait;
  timer_run(0u);
  return there;
}

int port_read(uint8_t* bytes, size_t room, uint32_t periods) {
  (void)room;
  if (!wait_for_byte(periods)) return 0;
  bytes[0] = (uint8_t)UART->data;
  UART->interrupt = receive_pending;
  NVIC_UNPEND = uart_receive_line;
  return 1;
}

void port_write(const uint8_t* bytes, size_t count) {
  size_t i;
  for (i = 0; i < count; ++i) {
    while (UART->state & transmit_full) {
    }
    UART->data = bytes[i];
  }
}

void port_gates(int enabled) { (void)enabled; } /* a real part: its gate enable pin */
