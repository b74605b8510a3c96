// The one place where gains of state feedback are made: what a scenario or gain file leaves open is designed from belief.
//
// Tables of settings (SettingTable), each a matrix a speed: gain_frequency_Hz, K, K_integral, reference_gain, L. Left open:
//   speeds   0 to three times rated in 6 equal steps
//   K, N     LQR of plant/linear/current_loop.hpp at current_bandwidth_Hz, integral_bandwidth_Hz
//   L        stationary Kalman gain of the three noises, or faster_than_controller
// Errors: std::invalid_argument with the key and what it must be.
#pragma once

#include "controllers/state_feedback.hpp"

namespace slipbench {

// `given` with its tables complete; L only where an observer is wanted or given. Gains of a file written from the result
// are these to the last bit.
Settings with_gains(const ControllerSetup& setup, const Settings& given);

// What the design starts from, as with_gains takes it.
struct StateFeedbackWeights {
  double bandwidth = 0.0, integral_bandwidth = 0.0;              // rad/s; 0: no integral action
  double current_noise_A = 0.0, voltage_V = 0.0, flux_Wb = 0.0;  // each component
  double faster_than_controller = 0.0;                           // 0: Kalman
};
StateFeedbackWeights state_feedback_weights(const ControllerSetup& setup, const Settings& given);

}  // namespace slipbench
