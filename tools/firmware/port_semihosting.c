/* The emulated board by pipes: frames through semihosting reads and writes of the two files that its command line names. Virtual
 * time stands still while such a read waits, so a watchdog by time cannot see silence here. */
#include "tools/firmware/port_count.h"
#include "tools/firmware/semihosting.h"
#include "tools/firmware/semihosting_files.h"

const char port_name[] = "slipbench firmware, M4F pipes";

static int in, out;

static int open_file(const char* name, int length, int mode) {
  const int file = semihosting_open(name, length, mode);
  if (file < 0) {
    semihosting_print("board: cannot open a file named on its command line: IN OUT expected\n");
    semihosting_exit(2);
  }
  return file;
}

void port_open(void) {
  char line[256];
  int at = 0, names[2][2], n;
  enum { read_binary = 1, write_binary = 5 };
  use_calibrate();
  if (!semihosting_command_line(line, (int)sizeof line)) semihosting_exit(2);
  while (line[at] != '\0' && line[at] != ' ') ++at; /* the program's name */
  for (n = 0; n < 2; ++n) {
    while (line[at] == ' ') ++at;
    names[n][0] = at;
    while (line[at] != '\0' && line[at] != ' ') ++at;
    names[n][1] = at - names[n][0];
    if (line[at] == ' ') line[at++] = '\0';
  }
  in = open_file(line + names[0][0], names[0][1], read_binary);
  out = open_file(line + names[1][0], names[1][1], write_binary);
}

int port_read(uint8_t* bytes, size_t room, uint32_t periods) {
  (void)periods;
  const int came = semihosting_read(in, bytes, (int)room);
  return came > 0 ? came : -1;
}

void port_write(const uint8_t* bytes, size_t count) {
  if (!semihosting_write(out, bytes, (int)count)) semihosting_exit(0); /* nobody listens any more */
}

void port_gates(int enabled) { (void)enabled; }
