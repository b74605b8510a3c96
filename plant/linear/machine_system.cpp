#include "plant/linear/machine_system.hpp"

#include "plant/linear/linearise.hpp"

namespace slipbench::linear {
namespace {

// f of the five states; the four of a held speed are its first.
struct Rates {
  const MachinePoint& at;

  template <class Real>
  std::array<Real, 5> operator()(const std::array<Real, 5>& x, const std::array<Real, 3>& u) const {
    const Machine<Real> m = in_number<Machine<Real>, Real>(make_machine(at.circuit));
    const auto rate = current_flux_rate(m, Real(at.frame_frequency), Vec2<Real>{x[0], x[1]}, Vec2<Real>{x[2], x[3]},
                                        Vec2<Real>{u[0], u[1]}, m.pole_pairs * x[4]);
    const Real per_inertia(at.inertia_kgm2 > 0.0 ? 1.0 / at.inertia_kgm2 : 0.0);
    return {rate.current.x, rate.current.y, rate.flux.x, rate.flux.y,
            per_inertia * (rate.torque - u[2] - Real(at.damping) * x[4])};
  }
};

System five(const MachinePoint& at) {
  // Voltage and load enter by sums: their values change no Jacobian.
  System s = linearise(
      Rates{at},
      [](const auto& x, const auto&) {
        return std::array{x[0], x[1], x[4]};
      },
      std::array{at.current.x, at.current.y, at.rotor_flux.x, at.rotor_flux.y, at.speed_rad_s},
      std::array<double, 3>{});
  const bool still = at.frame_frequency == 0.0;
  const std::string d = still ? "alpha" : "d", q = still ? "beta" : "q";
  s.state_names = {"i_" + d + "_A", "i_" + q + "_A", "psi_" + d + "_Wb", "psi_" + q + "_Wb", "speed_rad_s"};
  s.input_names = {"u_" + d + "_V", "u_" + q + "_V", "load_torque_Nm"};
  s.output_names = {"i_" + d + "_A", "i_" + q + "_A", "speed_rad_s"};
  return s;
}

}  // namespace

MachinePoint point_of(const Circuit<double>& circuit, const SteadyState& steady) {
  MachinePoint p;
  p.circuit = circuit;
  p.frame_frequency = steady.stator_frequency;
  p.current = steady.current;
  p.rotor_flux = steady.flux.rotor;
  p.speed_rad_s = steady.electrical_speed / circuit.pole_pairs;
  return p;
}

System machine_at_speed(const MachinePoint& point) {
  const System all = five(point);
  System s;
  s.A = all.A.topLeftCorner(4, 4);
  s.B = all.B.topLeftCorner(4, 2);
  s.C = all.C.topLeftCorner(2, 4);
  s.D = Matrix::Zero(2, 2);
  s.state_names.assign(all.state_names.begin(), all.state_names.begin() + 4);
  s.input_names.assign(all.input_names.begin(), all.input_names.begin() + 2);
  s.output_names.assign(all.output_names.begin(), all.output_names.begin() + 2);
  return s;
}

System machine_on_shaft(const MachinePoint& point, bool speed_measured) {
  if (!(point.inertia_kgm2 > 0.0))
    throw LinearError("the speed can't be a state: the inertia of the shaft is not given");
  System s = five(point);
  if (speed_measured) return s;
  s.C = s.C.topRows(2).eval();
  s.D = s.D.topRows(2).eval();
  s.output_names.pop_back();
  return s;
}

}  // namespace slipbench::linear
