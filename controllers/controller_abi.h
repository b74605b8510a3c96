/* The controller's door: plain C structs that every controller, built in or foreign, is fed with and answers in.
 * Version 1. SI units, motor convention, amplitude-invariant space vectors in the stationary frame.
 * `size` and `version` come first, so that a later version can append fields and an older reader still finds its own.
 * All calls for one controller come from one thread; the structs live for the call only. */
#ifndef SLIPBENCH_CONTROLLER_ABI_H
#define SLIPBENCH_CONTROLLER_ABI_H

#include <stdint.h>

#define SLIPBENCH_CONTROLLER_ABI_VERSION 1u

#ifdef __cplusplus
extern "C" {
#endif

/* What a controller sees at control tick k. */
typedef struct slipbench_measurement {
  uint32_t size;              /* sizeof(slipbench_measurement) of the caller */
  uint32_t version;           /* SLIPBENCH_CONTROLLER_ABI_VERSION of the caller */
  int64_t tick;               /* k, counts control periods from 0; negative in the run-in of a steady start */
  double i_alpha_A, i_beta_A; /* stator current measured at k */
  double dc_link_V;           /* measured at k */
  double speed_rad_s;   /* mechanical, from the sensor or the estimator that closes the loop; NaN without either */
  double rotor_flux_Wb; /* of the estimator that closes the flux loop (peak linkage, T circuit); 0 without one */
  double rotor_flux_angle_rad;  /* of the same, electrical, [-pi, pi); 0 without one */
  double speed_reference_rad_s; /* mechanical; 0 under torque control */
  double torque_reference_Nm;   /* 0 under speed control */
} slipbench_measurement;

/* What it commands. */
typedef struct slipbench_command {
  uint32_t size;
  uint32_t version;
  double duty_a, duty_b, duty_c;           /* of each leg, 0..1, acting over [k+d, k+d+1) */
  double clipped;                          /* 1 where the voltage limit cut the command, else 0 */
  double rotor_flux_reference_Wb;          /* after field weakening, peak linkage; for the record */
  double torque_reference_Nm;              /* after limits; for the record */
  double i_d_reference_A, i_q_reference_A; /* for the record; 0 where a method has none */
} slipbench_command;

#ifdef __cplusplus
}
#endif
#endif
