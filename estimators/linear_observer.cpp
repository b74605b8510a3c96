#include "estimators/linear_observer.hpp"

#include <stdexcept>

#include "plant/linear/current_loop.hpp"
#include "plant/linear/gain_table.hpp"

namespace slipbench {

Settings LinearObserver::with_gains(const EstimatorSetup& setup, const Settings& given) {
  Settings all = given;
  const double T = setup.control_period_s;
  linear::demand_gain_period(given, T);
  const bool has_gains = given.table("L") != nullptr;
  if (!has_gains && given.table("gain_frequency_Hz") == nullptr)
    all.set("gain_frequency_Hz", linear::default_gain_speeds(setup.nameplate));
  linear::demand_gain_speeds(all);
  if (!has_gains) {
    constexpr double component = 0.81649658092772603273;  // sqrt(2/3): of a vector from three sensors
    const Nameplate& plate = setup.nameplate;
    linear::ObserverNoise noise;
    noise.current_A =
        component * given.value("measured_current_noise_A", max(setup.current_noise_A, 1e-3 * plate.peak_current_A()));
    noise.voltage_V = given.value("process_voltage_V", 5e-3 * plate.phase_peak_V());
    noise.flux_Wb =
        given.value("process_flux_Wb", 0.02 * nominal_rotor_flux(setup) * believe(setup).per_flux_ratio * sqrt(T));
    SettingTable L;
    try {
      for (const double w : linear::gain_speeds_rad_s(all))
        linear::add_matrix(L, linear::stationary_observer(setup.circuit, T, w, noise));
    } catch (const linear::LinearError& error) {
      throw std::invalid_argument(std::string("no gain could be designed: ") + error.what());
    }
    all.set("L", std::move(L));
  }
  linear::demand_observer_gains(all);
  return all;
}

LinearObserver::Constants<double> LinearObserver::prepare(const EstimatorSetup& setup, const Settings& given) {
  Constants<double> c;
  c.machine = believe(setup);
  c.observer.model = current_flux_model(setup.circuit, setup.control_period_s);
  c.observer.gain = linear::observer_schedule(with_gains(setup, given));
  return c;
}

LinearObserver::State<double> LinearObserver::begin(const EstimatorSetup& setup, const Constants<double>& c) {
  State<double> s;
  s.observer.x.flux = {setup.start_rotor_flux_Wb, 0.0};
  s.observer.speed = c.machine.pole_pairs * setup.start_speed_rad_s;
  return s;
}

}  // namespace slipbench
