#include "sim/linear/drive_design.hpp"

#include <stdexcept>

#include "controllers/state_feedback_design.hpp"
#include "estimators/linear_observer.hpp"
#include "plant/linear/current_loop.hpp"
#include "plant/linear/gain_table.hpp"
#include "sim/engine/setup_parts.hpp"
#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647692;
constexpr const char* tables[] = {"gain_frequency_Hz", "K", "K_integral", "reference_gain", "L"};

// The scenario's own settings of a method but for its gains, which are to be made anew; the speeds stay.
Settings weights_of(const Settings& given) {
  Settings weights;
  for (const auto& [name, value] : given.given()) {
    if (name != "gain_period_s") weights.set(name, value);
  }
  if (const SettingTable* speeds = given.table("gain_frequency_Hz")) weights.set("gain_frequency_Hz", *speeds);
  return weights;
}

Settings gains_alone(const Settings& all, double period_s) {
  Settings gains;
  gains.set("gain_period_s", period_s);
  for (const char* name : tables) {
    if (const SettingTable* table = all.table(name)) gains.set(name, *table);
  }
  return gains;
}

std::string text(double value, const char* unit) { return short_text(value) + (*unit == 0 ? "" : " ") + unit; }

void describe(GainFile& file, const Scenario& s, const ControllerSetup& setup, const StateFeedbackWeights& w) {
  const Circuit<double>& c = setup.circuit;
  const double leakage = to_inverse_gamma(c).leakage;
  const auto say = [&](const char* name, std::string value) { file.made_for.emplace_back(name, std::move(value)); };
  say("slipbench gains", "current loop by state feedback and linear observer, scheduled over electrical speed");
  say("designed for", s.title.empty() ? "a scenario without title" : printable(s.title));
  say("machine", s.machine.file.empty() ? "as given there" : printable(s.machine.file));
  say("believed circuit", text(c.stator_resistance, "ohm, ") + text(c.rotor_resistance, "ohm; leakages ") +
                              text(c.stator_leakage, "H, ") + text(c.rotor_leakage, "H; magnetising ") +
                              text(c.magnetizing_inductance, "H"));
  say("control period", text(setup.control_period_s, "s, delay ") + std::to_string(setup.delay_periods) + " periods");
  say("weights",
      "current error 1; voltage beyond the flux's push " + text(1.0 / square(w.bandwidth * leakage), "A2/V2 (") +
          text(w.bandwidth / two_pi, "Hz); ") +
          (w.integral_bandwidth > 0.0 ? "integral of the error " + text(square(w.integral_bandwidth), "1/s2 (") +
                                            text(w.integral_bandwidth / two_pi, "Hz)")
                                      : "no integral action"));
  say("observer", w.faster_than_controller > 0.0
                      ? text(w.faster_than_controller, "times faster than current loop and rotor")
                      : "stationary Kalman; rms of each component: current " + text(w.current_noise_A, "A, voltage ") +
                            text(w.voltage_V, "V, flux ") + text(w.flux_Wb, "Wb a period"));
}

}  // namespace

DriveDesign design_drive(const Scenario& s, const DriveDesignOptions& options) {
  if (s.on_mains())
    throw InputError(s.path, "supply.kind",
                     "this scenario is on mains: without an inverter there is no current loop to design", "relation");
  ControllerSetup setup = controller_setup(s, Modulation::space_vector, false, false);
  setup.current_noise_A = current_noise(s);
  Settings given = s.controller.kind == "state_feedback" ? weights_of(s.controller.settings) : Settings();
  const auto change = [&](const char* name, const auto& value) {
    if (value) given.set(name, static_cast<double>(*value));
  };
  change("current_bandwidth_Hz", options.current_bandwidth_Hz);
  change("integral_bandwidth_Hz", options.integral_bandwidth_Hz);
  change("faster_than_controller", options.faster_than_controller);
  change("integral_action", options.integral_action);
  given.set("observer", options.observer ? 1.0 : 0.0);

  DriveDesign design;
  try {
    const Settings all = with_gains(setup, given);
    const StateFeedbackWeights weights = state_feedback_weights(setup, given);
    design.controller = gains_alone(all, setup.control_period_s);
    design.controller.set("integral_action", weights.integral_bandwidth > 0.0 ? 1.0 : 0.0);
    const linear::CurrentLoopDesign loop{setup.circuit, setup.control_period_s, setup.delay_periods, weights.bandwidth,
                                         weights.integral_bandwidth};
    const SettingTable& speeds = *all.table("gain_frequency_Hz");
    for (std::size_t n = 0; n < speeds.count; ++n) {
      const linear::CurrentLoopGains gains = linear::current_loop_gains(loop, two_pi * speeds(n));
      design.points.push_back({speeds(n), gains.poles, gains.residual, gains.condition, gains.warning});
    }
    describe(design.file, s, setup, weights);
    if (options.observer) {
      Settings for_estimator;
      for_estimator.set("gain_frequency_Hz", speeds);
      for_estimator.set("L", *all.table("L"));
      design.estimator = gains_alone(for_estimator, setup.control_period_s);
    }
  } catch (const std::invalid_argument& unfit) {
    throw InputError(s.path, "controller", std::string("no gains for this drive: ") + unfit.what(), "controller");
  }
  design.file.title = s.title.empty() ? "Gains" : "Gains for: " + s.title;
  design.file.controller = design.controller;
  design.file.estimator = design.estimator;
  return design;
}

}  // namespace slipbench
