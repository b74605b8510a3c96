/* Both doors as a C compiler sees them: where each field lies, for the C++ test to compare. */
#include "tests/controllers/doors_c99.h"

#include "controllers/controller_abi.h"
#include "estimators/estimator_abi.h"

#define AT(type, field) offsetof(type, field)

const size_t measurement_layout[] = {sizeof(slipbench_measurement),
                                     AT(slipbench_measurement, size),
                                     AT(slipbench_measurement, version),
                                     AT(slipbench_measurement, tick),
                                     AT(slipbench_measurement, i_alpha_A),
                                     AT(slipbench_measurement, i_beta_A),
                                     AT(slipbench_measurement, dc_link_V),
                                     AT(slipbench_measurement, speed_rad_s),
                                     AT(slipbench_measurement, rotor_flux_Wb),
                                     AT(slipbench_measurement, rotor_flux_angle_rad),
                                     AT(slipbench_measurement, speed_reference_rad_s),
                                     AT(slipbench_measurement, torque_reference_Nm)};
const size_t command_layout[] = {sizeof(slipbench_command),
                                 AT(slipbench_command, size),
                                 AT(slipbench_command, version),
                                 AT(slipbench_command, duty_a),
                                 AT(slipbench_command, duty_b),
                                 AT(slipbench_command, duty_c),
                                 AT(slipbench_command, clipped),
                                 AT(slipbench_command, rotor_flux_reference_Wb),
                                 AT(slipbench_command, torque_reference_Nm),
                                 AT(slipbench_command, i_d_reference_A),
                                 AT(slipbench_command, i_q_reference_A)};
const size_t sample_and_estimate_size[] = {sizeof(slipbench_sample), sizeof(slipbench_estimate)};

/* A controller as a foreigner writes one: half of the DC link on leg a, nothing else. */
void foreign_controller(const void* measurement, void* command) {
  const slipbench_measurement* m = (const slipbench_measurement*)measurement;
  slipbench_command* c = (slipbench_command*)command;
  if (m->size < sizeof *m || m->version != SLIPBENCH_CONTROLLER_ABI_VERSION) return;
  c->duty_a = 0.5 + m->speed_reference_rad_s / m->dc_link_V;
  c->duty_b = c->duty_c = 0.5;
  c->torque_reference_Nm = m->torque_reference_Nm + (double)m->tick;
  c->i_q_reference_A = m->i_beta_A;
}
