#include "sim/score/basis.hpp"

#include <algorithm>

#include "plant/steady_state.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

ScoreBasis score_basis(const Scenario& scenario) {
  ScoreBasis basis;
  basis.window = {scenario.score.from_s, scenario.score.to_s};
  basis.control_period_s = scenario.run.control_period_s;
  basis.circuit = scenario.machine.circuit();
  basis.rated_speed_rpm = scenario.machine.rated_speed_rpm;
  basis.rated_rotor_flux_Wb = rated_rotor_flux(basis.circuit, scenario.machine.nameplate());
  basis.lost_error = scenario.score.lost_error;
  basis.lost_for_s = scenario.score.lost_for_s;
  basis.settled_error = scenario.score.settled_error;
  basis.has_controller = !scenario.controller.kind.empty();
  for (const LoadSettings& load : scenario.loads) {
    const Knots& knots = load.torque_profile;
    for (std::size_t i = 1; i < knots.size(); ++i) {
      if (knots[i][0] == knots[i - 1][0] && knots[i][1] != knots[i - 1][1]) basis.load_steps_s.push_back(knots[i][0]);
    }
  }
  std::sort(basis.load_steps_s.begin(), basis.load_steps_s.end());
  for (const DriftSettings& drift : scenario.drifts) {
    const Profile factor(drift.factor, 1.0, 1.0);
    if (drift.quantity == "magnetizing_inductance") basis.magnetizing_factor = factor;
    if (drift.quantity == "stator_leakage") basis.stator_leakage_factor = factor;
    if (drift.quantity == "rotor_leakage") basis.rotor_leakage_factor = factor;
  }
  return basis;
}

}  // namespace slipbench
