#include "semihosting.h"

#include <stdint.h>

enum { sys_write0 = 0x04, sys_exit_extended = 0x20, stopped_by_application = 0x20026 };

static void call(uint32_t operation, const void *argument) {
  register uint32_t r0 __asm("r0") = operation;
  register const void *r1 __asm("r1") = argument;
  __asm volatile("bkpt 0xAB" : "+r"(r0) : "r"(r1) : "memory");
}

void semihosting_print(const char *text) { call(sys_write0, text); }

void semihosting_print_unsigned(unsigned long number) {
  char digits[24];
  char *at = digits + sizeof digits - 1;
  *at = '\0';
  do {
    *--at = (char)('0' + number % 10u);
    number /= 10u;
  } while (number != 0u);
  semihosting_print(at);
}

void semihosting_exit(int status) {
  const uint32_t block[2] = {stopped_by_application, (uint32_t)status};
  call(sys_exit_extended, block);
  for (;;) {
  }
}
