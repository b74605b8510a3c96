/* Calls to whatever runs this program: QEMU, or a debug probe. Source: Arm, "Semihosting for AArch32 and AArch64". */
#ifndef SEMIHOSTING_H
#define SEMIHOSTING_H

/* To the host's console. */
void semihosting_print(const char *text);
void semihosting_print_unsigned(unsigned long number);
/* Ends the emulation with this exit status (SYS_EXIT_EXTENDED). */
void semihosting_exit(int status) __attribute__((noreturn));

#endif
