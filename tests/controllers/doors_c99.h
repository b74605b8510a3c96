/* What doors_c99.c tells the test. */
#ifndef SLIPBENCH_TESTS_DOORS_C99_H
#define SLIPBENCH_TESTS_DOORS_C99_H

#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif
extern const size_t measurement_layout[12], command_layout[11], sample_and_estimate_size[2];
void foreign_controller(const void* measurement, void* command);
#ifdef __cplusplus
}
#endif
#endif
