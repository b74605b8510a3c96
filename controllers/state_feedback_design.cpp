#include "controllers/state_feedback_design.hpp"

#include <stdexcept>
#include <string>

#include "plant/linear/current_loop.hpp"
#include "plant/linear/gain_table.hpp"

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647692;

void design_feedback(const ControllerSetup& setup, const StateFeedbackWeights& weights, Settings& to) {
  const std::vector<double> speeds = linear::gain_speeds_rad_s(to);
  const linear::CurrentLoopDesign design{setup.circuit, setup.control_period_s, setup.delay_periods, weights.bandwidth,
                                         weights.integral_bandwidth};
  SettingTable K, K_integral, N;
  for (const double w : speeds) {
    const linear::CurrentLoopGains gains = linear::current_loop_gains(design, w);
    linear::add_matrix(K, gains.K), linear::add_matrix(N, gains.N);
    if (gains.K_integral.size() > 0) linear::add_matrix(K_integral, gains.K_integral);
  }
  to.set("K", std::move(K));
  to.set("reference_gain", std::move(N));
  if (K_integral.count > 0) to.set("K_integral", std::move(K_integral));
}

void design_observer(const ControllerSetup& setup, const StateFeedbackWeights& weights, Settings& to) {
  const std::vector<double> speeds = linear::gain_speeds_rad_s(to);
  const double T = setup.control_period_s;
  SettingTable L;
  for (const double w : speeds) {
    linear::add_matrix(
        L, weights.faster_than_controller > 0.0
               ? linear::faster_observer(setup.circuit, T, w, weights.bandwidth, weights.faster_than_controller)
               : linear::stationary_observer(setup.circuit, T, w,
                                             {weights.current_noise_A, weights.voltage_V, weights.flux_Wb}));
  }
  to.set("L", std::move(L));
}

}  // namespace

StateFeedbackWeights state_feedback_weights(const ControllerSetup& setup, const Settings& given) {
  constexpr double component = 0.81649658092772603273;  // sqrt(2/3): of a vector from three sensors
  const Nameplate& plate = setup.nameplate;
  StateFeedbackWeights w;
  w.bandwidth = RotorFluxOriented::current_bandwidth(setup, given);
  if (given.value("integral_action", 1.0) > 0.5)
    w.integral_bandwidth = two_pi * given.value("integral_bandwidth_Hz", 0.2 * w.bandwidth / two_pi);
  w.current_noise_A =
      component * given.value("measured_current_noise_A", max(setup.current_noise_A, 1e-3 * plate.peak_current_A()));
  w.voltage_V = given.value("process_voltage_V", 5e-3 * plate.phase_peak_V());
  w.flux_Wb = given.value("process_flux_Wb", 0.02 * setup.rotor_flux_reference_Wb * sqrt(setup.control_period_s));
  w.faster_than_controller = given.value("faster_than_controller", 0.0);
  return w;
}

Settings with_gains(const ControllerSetup& setup, const Settings& given) {
  const bool integral = given.value("integral_action", 1.0) > 0.5, observer = given.value("observer", 0.0) > 0.5;
  const StateFeedbackWeights weights = state_feedback_weights(setup, given);
  Settings all = given;
  linear::demand_gain_period(given, setup.control_period_s);
  const bool fed = given.table("K") != nullptr;
  if (!fed && given.table("L") == nullptr && given.table("gain_frequency_Hz") == nullptr)
    all.set("gain_frequency_Hz", linear::default_gain_speeds(setup.nameplate));
  linear::demand_gain_speeds(all);
  if (!fed && (given.table("K_integral") != nullptr || given.table("reference_gain") != nullptr))
    throw std::invalid_argument("K is missing: K_integral and reference_gain belong to it");
  if (fed && !integral && given.table("K_integral") != nullptr)
    throw std::invalid_argument(
        "integral_action is false, but the given gains were designed with it (K_integral): its K and reference_gain "
        "would "
        "leave an error; design them anew without it");
  try {
    if (!fed) design_feedback(setup, weights, all);
    if (observer && given.table("L") == nullptr) design_observer(setup, weights, all);
  } catch (const linear::LinearError& error) {
    throw std::invalid_argument(std::string("no gain could be designed: ") + error.what());
  }
  const auto columns = static_cast<std::size_t>(4 + 2 * setup.delay_periods);
  linear::demand_gains(all, "K", 2, columns,
                       "its columns are i_d, i_q, psi_d, psi_q and two voltages for each of the " +
                           std::to_string(setup.delay_periods) + " periods of delay");
  linear::demand_gains(all, "reference_gain", 2, 2, "it goes with K");
  if (integral) linear::demand_gains(all, "K_integral", 2, 2, "integral_action is true, and it goes with K");
  if (all.table("L") != nullptr) linear::demand_observer_gains(all);
  return all;
}

}  // namespace slipbench
