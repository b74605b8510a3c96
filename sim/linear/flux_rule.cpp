#include "sim/linear/flux_rule.hpp"

#include <stdexcept>

#include "plant/linear/speed_observability.hpp"
#include "plant/steady_state.hpp"
#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

FluxRule::FluxRule(const Scenario& s) : circuit_(s.machine.circuit()) {
  const Nameplate plate = s.machine.nameplate();
  if (s.on_mains()) {
    flux_ = rated_rotor_flux(circuit_, plate);
    text_ = "rotor flux of the rated point";
    return;
  }
  flux_ = s.reference.rotor_flux_Wb > 0.0 ? s.reference.rotor_flux_Wb : rated_rotor_flux(circuit_, plate);
  weakening_from_ = plate.angular_frequency();
  text_ = "reference flux, weakened above rated frequency";
  if (s.controller.kind != RotorFluxOriented::kind) return;
  Scenario right = s;
  right.belief = {};
  try {
    controller_ =
        RotorFluxOriented::prepare(controller_setup(right, modulation_of(s), false, false), s.controller.settings);
  } catch (const std::invalid_argument& unfit) {
    throw InputError(s.path, "controller", std::string("the controller cannot be set up: ") + unfit.what(),
                     "controller");
  }
  dc_link_V_ = s.supply.dc_link_V;
  text_ = "reference flux, weakened as the controller does";
}

double FluxRule::at(double speed_rad_s, double torque_Nm) const {
  if (controller_) return RotorFluxOriented::steady_rotor_flux(*controller_, dc_link_V_, speed_rad_s, torque_Nm);
  const double electrical = fabs(circuit_.pole_pairs * speed_rad_s);
  return weakening_from_ > 0.0 ? flux_ * min(1.0, weakening_from_ / max(electrical, 1e-9)) : flux_;
}

bool FluxRule::within_reach(double speed_rad_s, double torque_Nm) const {
  if (!controller_) return true;
  const double flux = at(speed_rad_s, torque_Nm);
  const Vec2<double> current{flux / circuit_.magnetizing_inductance,
                             torque_Nm / (controller_->torque_per_ampere * flux)};
  // The rule's iteration ends at its floor where no flux gives the torque.
  return flux > 1.0001 * controller_->orientation.flux_floor && magnitude(current) <= controller_->flux.current_limit;
}

double FluxRule::speed_at_frequency(double torque_Nm, double w_s) const {
  // Weakening is mild where slip and frequency matter: a few rounds settle it to rounding.
  const double p = circuit_.pole_pairs;
  double speed = w_s / p;
  for (int round = 0; round < 50; ++round)
    speed = linear::speed_at_frequency(circuit_, at(speed, torque_Nm), torque_Nm, w_s) / p;
  return speed;
}

}  // namespace slipbench
