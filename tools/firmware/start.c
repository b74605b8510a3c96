/* Start-up of a bare Cortex-M4F: vector table, FPU on, memory laid out, then main; its result ends the emulation.
 * A fault ends it too, with status 100 + its exception number (a double-precision instruction faults on this core). */
#include <stdint.h>

#include "semihosting.h"

extern uint32_t data_load[], data_start[], data_end[], bss_start[], bss_end[], stack_top[];
int main(void);

void reset(void) __attribute__((noreturn));
static void fault(void) __attribute__((noreturn));

/* First thing, and without floating point: coprocessors 10 and 11 are the FPU (CPACR, ARMv7-M reference manual B3.2.20). */
void reset(void) {
  volatile uint32_t *const cpacr = (volatile uint32_t *)0xE000ED88u;
  uint32_t *to;
  const uint32_t *from = data_load;
  *cpacr |= 0xFu << 20;
  __asm volatile("dsb\n isb" ::: "memory");
  for (to = data_start; to < data_end; ++to) *to = *from++;
  for (to = bss_start; to < bss_end; ++to) *to = 0;
  semihosting_exit(main());
}

static void fault(void) {
  uint32_t exception;
  __asm volatile("mrs %0, ipsr" : "=r"(exception));
  semihosting_exit(100 + (int)(exception & 0xFFu));
}

/* The sixteen of the core; interrupts of the part follow where a program needs them. */
__attribute__((section(".vectors"), used)) static const void *const vectors[16] = {
    stack_top, (const void *)reset, (const void *)fault, (const void *)fault, (const void *)fault, (const void *)fault,
    (const void *)fault, 0, 0, 0, 0, (const void *)fault, (const void *)fault, 0, (const void *)fault, (const void *)fault};
