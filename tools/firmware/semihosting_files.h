/* Semihosting calls on files of whatever runs this program. Source: Arm, "Semihosting for AArch32 and AArch64". */
#ifndef SEMIHOSTING_FILES_H
#define SEMIHOSTING_FILES_H

/* A handle, or -1. Modes as of fopen, numbered: 1 "rb", 5 "wb". */
int semihosting_open(const char* name, int length, int mode);
/* Waits for at least a byte; how many came, 0 at the end of the file. */
int semihosting_read(int file, void* to, int room);
/* 1 when all was written. */
int semihosting_write(int file, const void* from, int count);
/* 1 when the command line fits. */
int semihosting_command_line(char* to, int room);

#endif
