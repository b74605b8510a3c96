/* What the board computes in a control period: readings, the exported estimator and controller, duties. No hardware here.
 *
 *   sample of tick k -> currents, DC link, mean voltage believed applied over [k-1, k) -> estimate -> command -> duties and gates
 *
 * All single precision; the numbers of drive and tuning come from the scenario that the image was built from (board_drive.h). */
#ifndef SLIPBENCH_FIRMWARE_CONTROL_H
#define SLIPBENCH_FIRMWARE_CONTROL_H

#include <board_drive.h> /* written at build time */
#include "sim/board/frames.h"

/* Faults, latched until the next ask. */
enum { FAULT_NONE = 0, FAULT_SILENCE = 1, FAULT_OVERCURRENT = 2, FAULT_COMMAND = 3 };

typedef struct control {
  board_estimator_state estimator;
  board_controller_state controller;
  float current[2], dc_link;              /* of the tick before, A and V */
  float duty[BOARD_DELAY_PERIODS + 1][3]; /* commanded at k-1, k-2, ...; the last acted over [k-1, k) */
  int begun;
  uint8_t fault;
} control;

void control_begin(control* c);
/* Everything of `answer` but `used`. */
void control_step(control* c, const board_sample* sample, board_answer* answer);

#endif
