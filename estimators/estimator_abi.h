/* The estimator's door: plain C structs that every estimator, built in or foreign, is fed with and answers in.
 * Version 1. SI units, motor convention, amplitude-invariant space vectors in the stationary frame.
 * `size` and `version` come first, so that a later version can append fields and an older reader still finds its own.
 * All calls for one estimator come from one thread; the structs live for the call only. */
#ifndef SLIPBENCH_ESTIMATOR_ABI_H
#define SLIPBENCH_ESTIMATOR_ABI_H

#include <stdint.h>

#define SLIPBENCH_ESTIMATOR_ABI_VERSION 1u

#ifdef __cplusplus
extern "C" {
#endif

/* What an estimator sees at control tick k. */
typedef struct slipbench_sample {
  uint32_t size;              /* sizeof(slipbench_sample) of the caller */
  uint32_t version;           /* SLIPBENCH_ESTIMATOR_ABI_VERSION of the caller */
  int64_t tick;               /* k, counts control periods from 0 */
  double u_alpha_V, u_beta_V; /* mean stator voltage believed applied over [k-1, k) */
  double i_alpha_A, i_beta_A; /* stator current measured at k */
  double dc_link_V;           /* measured at k; NaN on mains */
  double speed_rad_s;         /* mechanical, from the speed sensor at k; NaN without one */
} slipbench_sample;

/* What it answers, valid at tick k. */
typedef struct slipbench_estimate {
  uint32_t size;
  uint32_t version;
  double speed_rad_s;          /* mechanical */
  double rotor_flux_Wb;        /* magnitude of the rotor flux linkage (T circuit), peak */
  double rotor_flux_angle_rad; /* electrical, of the rotor flux in the stationary frame, [-pi, pi) */
  double torque_Nm;            /* electromagnetic */
  double trust;                /* 0 (blind) .. 1 */
  double has_covariance;       /* 1: the next field is filled, 0: not */
  double covariance[6];        /* of (psi_r_alpha Wb, psi_r_beta Wb, speed rad/s): 11, 12, 13, 22, 23, 33 */
} slipbench_estimate;

#ifdef __cplusplus
}
#endif
#endif
