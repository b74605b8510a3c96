// What the C structs of an exported step hold: members with their units, in the order of the fields of Sample, Estimate,
// Measurement and Command, whose meaning estimators/estimator_abi.h and controllers/controller_abi.h fix.
#pragma once

#include <span>
#include <string_view>

#include "controllers/control.hpp"
#include "estimators/sample.hpp"

namespace slipbench {

struct DoorField {
  std::string_view member;   // with its unit
  std::string_view local;    // the variable it is read into
  std::string_view meaning;  // for the comment
};

inline constexpr DoorField sample_fields[] = {
    {"u_alpha_V", "u_alpha", "mean stator voltage believed applied over the period that ends now, peak"},
    {"u_beta_V", "u_beta", ""},
    {"i_alpha_A", "i_alpha", "stator current measured now, peak"},
    {"i_beta_A", "i_beta", ""},
    {"dc_link_V", "dc_link", "measured now"},
    {"speed_rad_s", "speed_measured", "mechanical, from a speed sensor"},
};
inline constexpr DoorField estimate_fields[] = {
    {"speed_rad_s", "speed", "mechanical"},
    {"rotor_flux_Wb", "rotor_flux", "length of the rotor flux linkage (T circuit), peak"},
    {"rotor_flux_angle_rad", "rotor_flux_angle", "electrical, of the rotor flux in the stationary frame, [-pi, pi)"},
    {"torque_Nm", "torque", "electromagnetic"},
    {"trust", "trust", "0 (blind) .. 1"},
    {"has_covariance", "has_covariance", "1: the next six are filled"},
    {"covariance_11", "covariance_11", "of (psi_r_alpha Wb, psi_r_beta Wb, speed rad/s)"},
    {"covariance_12", "covariance_12", ""},
    {"covariance_13", "covariance_13", ""},
    {"covariance_22", "covariance_22", ""},
    {"covariance_23", "covariance_23", ""},
    {"covariance_33", "covariance_33", ""},
};
inline constexpr DoorField measurement_fields[] = {
    {"i_alpha_A", "i_alpha", "stator current measured now, peak"},
    {"i_beta_A", "i_beta", ""},
    {"dc_link_V", "dc_link", "measured now"},
    {"speed_rad_s", "speed", "mechanical, from the sensor or the estimator that closes the loop"},
    {"rotor_flux_Wb", "flux_given", "of the estimator that closes the flux loop, 0 without one"},
    {"rotor_flux_angle_rad", "flux_angle_given", "of the same, electrical, [-pi, pi)"},
    {"speed_reference_rad_s", "speed_reference", "mechanical; 0 under torque control"},
    {"torque_reference_Nm", "torque_reference_given", "0 under speed control"},
};
inline constexpr DoorField command_fields[] = {
    {"duty_a", "duty_a", "of each leg, 0 .. 1, for the period that begins controller.delay_periods from now"},
    {"duty_b", "duty_b", ""},
    {"duty_c", "duty_c", ""},
    {"clipped", "clipped", "1 where the voltage limit cut the command, else 0"},
    {"rotor_flux_reference_Wb", "rotor_flux_reference", "after field weakening, peak; for the record"},
    {"torque_reference_Nm", "torque_reference", "after limits; for the record"},
    {"i_d_reference_A", "i_d_reference", "for the record; 0 where the method has none"},
    {"i_q_reference_A", "i_q_reference", ""},
};

// The door of estimators, and that of controllers.
struct EstimatorDoor {
  template <class Real>
  using In = Sample<Real>;
  template <class Real>
  using Out = Estimate<Real>;
  static constexpr std::span<const DoorField> in = sample_fields, out = estimate_fields;
  static constexpr std::string_view in_name = "sample", out_name = "estimate";
};
struct ControllerDoor {
  template <class Real>
  using In = Measurement<Real>;
  template <class Real>
  using Out = Command<Real>;
  static constexpr std::span<const DoorField> in = measurement_fields, out = command_fields;
  static constexpr std::string_view in_name = "measurement", out_name = "command";
};

}  // namespace slipbench
