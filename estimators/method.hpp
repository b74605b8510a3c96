// What an estimation method is: a struct of types and static functions, no virtual call inside.
//
//   struct Method {
//     static constexpr std::string_view kind;                        // name in a scenario
//     static constexpr std::array<Setting, n> settings;              // what a scenario may set
//     static constexpr bool needs_speed = true;                      // only where the speed is told by a sensor
//     template <class Real> struct Constants { ...; SLIPBENCH_FIELDS(...) };
//     template <class Real> struct State { ...; SLIPBENCH_FIELDS(...) };
//     static constexpr std::string_view state_note;                  // its units, for exported code; may be left out
//     static Constants<double> prepare(const EstimatorSetup&, const Settings&);        // once, in double
//     static State<double> begin(const EstimatorSetup&, const Constants<double>&);     // state at tick 0
//     template <class Real>
//     static Estimate<Real> step(State<Real>&, const Sample<Real>&, const Constants<Real>&);   // pure but for `state`
//   };
//
// `step` at tick k predicts from k-1 to k with the mean voltage of that period and corrects with the current at k.
// Branches depend on constants that are structural (same in all lanes) only; data-dependent choice is `select`.
#pragma once

#include <array>
#include <string_view>

#include "estimators/sample.hpp"
#include "plant/math/elementary.hpp"
#include "plant/parameters.hpp"
#include "plant/setting.hpp"

namespace slipbench {

// What an estimator may know before it starts: belief and nameplate, never the plant.
struct EstimatorSetup {
  Circuit<double> circuit;  // as believed
  Nameplate nameplate;
  double inertia_kgm2 = 0.0;  // as believed, all referred to the motor
  double viscous_friction_Nms = 0.0;
  double control_period_s = 100e-6;
  int current_sensors = 3;       // 3 or 2
  double current_noise_A = 0.0;  // rms a phase, ADC quantisation included
  // State believed at tick 0: at rest unless the run starts otherwise. The flux lies on the alpha axis.
  double start_rotor_flux_Wb = 0.0;
  double start_speed_rad_s = 0.0;
};

}  // namespace slipbench
