#include "tools/firmware/semihosting_files.h"

#include <stdint.h>

enum { sys_open = 0x01, sys_write = 0x05, sys_read = 0x06, sys_get_cmdline = 0x15 };

static int32_t call(uint32_t operation, void* argument) {
  register uint32_t r0 __asm("r0") = operation;
  register void* r1 __asm("r1") = argument;
  __asm volatile("bkpt 0xAB" : "+r"(r0) : "r"(r1) : "memory");
  return (int32_t)r0;
}

static uint32_t address(const void* p) { return (uint32_t)(uintptr_t)p; }

int semihosting_open(const char* name, int length, int mode) {
  uint32_t block[3] = {address(name), (uint32_t)mode, (uint32_t)length};
  return call(sys_open, block);
}

int semihosting_read(int file, void* to, int room) {
  uint32_t block[3] = {(uint32_t)file, address(to), (uint32_t)room};
  const int32_t missing = call(sys_read, block);
  return missing >= 0 && missing <= room ? room - missing : 0;
}

int semihosting_write(int file, const void* from, int count) {
  uint32_t block[3] = {(uint32_t)file, address(from), (uint32_t)count};
  return call(sys_write, block) == 0;
}

int semihosting_command_line(char* to, int room) {
  uint32_t block[2] = {address(to), (uint32_t)room};
  return call(sys_get_cmdline, block) == 0;
}
