#include "tools/firmware/control.h"

#include <string.h>

enum { LOWEST_CODE = -(1 << (BOARD_CURRENT_BITS - 1)), HIGHEST_CODE = (1 << (BOARD_CURRENT_BITS - 1)) - 1 };

void control_begin(control* c) {
  int i, leg;
  memset(c, 0, sizeof *c);
  board_estimator_init(&c->estimator);
  board_controller_init(&c->controller);
  for (i = 0; i <= BOARD_DELAY_PERIODS; ++i) {
    for (leg = 0; leg < 3; ++leg) c->duty[i][leg] = 0.5f;
  }
}

/* A converter at its end no longer measures: taken for an overcurrent. A real part trips in hardware, before this. */
static int overcurrent(const board_sample* s) {
  int phase;
  for (phase = 0; phase < BOARD_CURRENTS; ++phase) {
    if (s->current[phase] <= LOWEST_CODE || s->current[phase] >= HIGHEST_CODE) return 1;
  }
  return 0;
}

static void read_drive(control* c, const board_sample* s, board_estimator_sample* seen) {
  const float* acted = c->duty[BOARD_DELAY_PERIODS];
  const float codes = (float)s->dc_link;
  float in[BOARD_READ_INPUTS], out[BOARD_READ_OUTPUTS];
  in[BOARD_READ_CODE_A] = (float)s->current[0];
  in[BOARD_READ_CODE_B] = (float)s->current[1];
  in[BOARD_READ_CODE_C] = (float)s->current[2];
  in[BOARD_READ_CODE_DC_LINK] = codes;
  in[BOARD_READ_BEFORE_I_ALPHA] = c->current[0];
  in[BOARD_READ_BEFORE_I_BETA] = c->current[1];
  in[BOARD_READ_BEFORE_DC_LINK] = c->begun ? c->dc_link : codes * BOARD_DC_LINK_V_PER_CODE;
  in[BOARD_READ_DUTY_A] = acted[0];
  in[BOARD_READ_DUTY_B] = acted[1];
  in[BOARD_READ_DUTY_C] = acted[2];
  board_read(in, out);
  c->begun = 1;
  c->current[0] = seen->i_alpha_A = out[BOARD_READ_I_ALPHA];
  c->current[1] = seen->i_beta_A = out[BOARD_READ_I_BETA];
  c->dc_link = seen->dc_link_V = out[BOARD_READ_DC_LINK];
  seen->u_alpha_V = out[BOARD_READ_U_ALPHA];
  seen->u_beta_V = out[BOARD_READ_U_BETA];
  seen->speed_rad_s = 0.0f; /* no sensor */
}

static uint16_t duty_code(float duty) { return (uint16_t)(duty * (float)BOARD_DUTY_COUNTS + 0.5f); }

void control_step(control* c, const board_sample* s, board_answer* a) {
  board_estimator_sample seen;
  board_estimator_estimate estimate;
  board_controller_measurement measured;
  board_controller_command command;
  float duty[3];
  int i, leg;
  memset(&measured, 0, sizeof measured);
  read_drive(c, s, &seen);
  board_estimator_step(&c->estimator, &seen, &estimate);
  measured.i_alpha_A = seen.i_alpha_A;
  measured.i_beta_A = seen.i_beta_A;
  measured.dc_link_V = seen.dc_link_V;
  measured.speed_rad_s = estimate.speed_rad_s;
#if BOARD_FLUX_FROM_ESTIMATOR
  measured.rotor_flux_Wb = estimate.rotor_flux_Wb;
  measured.rotor_flux_angle_rad = estimate.rotor_flux_angle_rad;
#endif
  measured.speed_reference_rad_s = s->speed_reference_rad_s;
  measured.torque_reference_Nm = s->torque_reference_Nm;
  board_controller_step(&c->controller, &measured, &command);
  duty[0] = command.duty_a, duty[1] = command.duty_b, duty[2] = command.duty_c;

  if (c->fault == FAULT_NONE && overcurrent(s)) c->fault = FAULT_OVERCURRENT;
  for (leg = 0; leg < 3; ++leg) {
    if (duty[leg] >= 0.0f && duty[leg] <= 1.0f) continue; /* false for what is no number, too */
    duty[leg] = 0.5f;
    if (c->fault == FAULT_NONE) c->fault = FAULT_COMMAND;
  }
  for (i = BOARD_DELAY_PERIODS; i > 0; --i) memcpy(c->duty[i], c->duty[i - 1], sizeof c->duty[i]);
  a->sequence = s->sequence;
  a->tick = s->tick;
  a->gates = c->fault == FAULT_NONE;
  a->fault = c->fault;
  for (leg = 0; leg < 3; ++leg) {
    a->duty[leg] = duty_code(duty[leg]);
    c->duty[0][leg] = (float)a->duty[leg] * (1.0f / (float)BOARD_DUTY_COUNTS); /* as the PWM unit gives it */
  }
  a->speed_rad_s = estimate.speed_rad_s;
  a->rotor_flux_Wb = estimate.rotor_flux_Wb;
  a->rotor_flux_angle_rad = estimate.rotor_flux_angle_rad;
  a->torque_Nm = estimate.torque_Nm;
}
