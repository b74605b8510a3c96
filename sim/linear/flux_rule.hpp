// The rotor flux that a scenario's drive steadily has at a speed and torque: what maps of the torque-speed plane assume.
//
//   rotor_flux_oriented   the controller's own: the reference, lowered where the voltage of the DC link would not do
//   other inverter drives the reference times min(1, rated / |electrical speed|), as a steady start assumes
//   mains                 the circuit's at rated voltage, frequency and speed
//
// Parameters believed right throughout: a wrong belief moves the flux of an indirect orientation, which these maps leave out.
#pragma once

#include <optional>
#include <string>

#include "controllers/rotor_flux_oriented.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

class FluxRule {
 public:
  explicit FluxRule(const Scenario& scenario);  // throws InputError where the controller refuses its settings
  [[nodiscard]] double at(double speed_rad_s, double torque_Nm) const;  // Wb
  // Whether voltage and current suffice for this torque there; true where no rotor_flux_oriented controller tells.
  [[nodiscard]] bool within_reach(double speed_rad_s, double torque_Nm) const;
  // Mechanical speed at which the flux there, at this torque, turns at w_s (electrical rad/s).
  [[nodiscard]] double speed_at_frequency(double torque_Nm, double w_s) const;
  [[nodiscard]] const std::string& text() const { return text_; }  // one clause for a figure

 private:
  Circuit<double> circuit_;
  double flux_ = 0.0, weakening_from_ = 0.0, dc_link_V_ = 0.0;  // Wb, electrical rad/s (0: never)
  std::optional<RotorFluxOriented::Constants<double>> controller_;
  std::string text_;
};

}  // namespace slipbench
