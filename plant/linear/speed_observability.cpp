#include "plant/linear/speed_observability.hpp"

#include <Eigen/SVD>

#include "plant/linear/lie.hpp"

namespace slipbench::linear {
namespace {

// x: i_d, i_q, psi_d, psi_q, w_r, and T_load where N = 6.
template <std::size_t N>
struct Flow {
  const SpeedPoint& at;
  bool shaft;

  template <class Real>
  std::array<Real, N> operator()(const std::array<Real, N>& x) const {
    const MachinePoint& p = at.machine;
    const Machine<Real> m = in_number<Machine<Real>, Real>(make_machine(p.circuit));
    const auto rate = current_flux_rate(m, Real(p.frame_frequency), Vec2<Real>{x[0], x[1]}, Vec2<Real>{x[2], x[3]},
                                        Vec2<Real>{Real(at.voltage.x), Real(at.voltage.y)}, x[4]);
    std::array<Real, N> out{rate.current.x, rate.current.y, rate.flux.x, rate.flux.y};
    if (!shaft) return out;
    Real load(at.load_torque_Nm);
    if constexpr (N == 6) load = x[5];
    const Real damping(p.damping / p.circuit.pole_pairs), gain(p.circuit.pole_pairs / p.inertia_kgm2);
    out[4] = gain * (rate.torque - load - damping * x[4]);
    return out;
  }
};

template <std::size_t N>
Matrix scaled(const SpeedPoint& at, bool shaft, const PerUnit& unit) {
  const MachinePoint& p = at.machine;
  std::array<double, N> x{p.current.x, p.current.y, p.rotor_flux.x, p.rotor_flux.y,
                          p.circuit.pole_pairs * p.speed_rad_s};
  std::array<double, N> base{unit.current, unit.current, unit.flux, unit.flux, unit.frequency};
  if constexpr (N == 6) {
    x[5] = at.load_torque_Nm;
    base[5] = unit.torque;
  }
  Matrix rows = lie_rows<N - 1>(
      Flow<N>{at, shaft},
      [](const auto& s) {
        return std::array{s[0], s[1]};
      },
      x);
  double per = 1.0 / unit.current;
  for (Eigen::Index r = 0; r < rows.rows(); ++r) {
    if (r > 0 && r % 2 == 0) per /= unit.frequency;
    for (Eigen::Index c = 0; c < rows.cols(); ++c) rows(r, c) *= per * base[static_cast<std::size_t>(c)];
  }
  return rows;
}

constexpr double rank_tolerance = 1e-10;

}  // namespace

std::string_view name_of(SpeedModel model) {
  return model == SpeedModel::constant_speed ? "constant_speed"
         : model == SpeedModel::unknown_load ? "unknown_load"
                                             : "known_load";
}

PerUnit per_unit_of(const Nameplate& plate) {
  return {plate.peak_current_A(), plate.phase_peak_V() / plate.angular_frequency(), plate.angular_frequency(),
          plate.torque_Nm};
}

Matrix speed_observability_matrix(const SpeedPoint& point, SpeedModel model, const PerUnit& unit) {
  const bool shaft = model != SpeedModel::constant_speed;
  if (shaft && !(point.machine.inertia_kgm2 > 0.0))
    throw LinearError("observability with the " + std::string(name_of(model)) +
                      " model needs the shaft's inertia; without it take the constant_speed model");
  return model == SpeedModel::unknown_load ? scaled<6>(point, shaft, unit) : scaled<5>(point, shaft, unit);
}

SpeedObservability speed_observability(const SpeedPoint& point, SpeedModel model, const PerUnit& unit) {
  const Matrix rows = speed_observability_matrix(point, model, unit);
  SpeedObservability o;
  o.states = rows.cols();
  if (!rows.allFinite()) return o;
  const Vector values = Eigen::JacobiSVD<Matrix>(rows).singularValues();
  o.largest = values(0);
  o.smallest = values(values.size() - 1);
  o.rank = (values.array() > rank_tolerance * o.largest).count();
  return o;
}

SpeedPoint steady_speed_point(const Circuit<double>& circuit, double inertia_kgm2, double damping, double rotor_flux,
                              double torque, double speed_rad_s) {
  const SteadyState s = steady_at_flux(circuit, rotor_flux, torque, circuit.pole_pairs * speed_rad_s);
  SpeedPoint p{point_of(circuit, s), s.voltage, torque - damping * speed_rad_s};
  p.machine.inertia_kgm2 = inertia_kgm2;
  p.machine.damping = damping;
  return p;
}

double speed_at_frequency(const Circuit<double>& c, double rotor_flux, double torque, double w_s) {
  return w_s - c.rotor_resistance * torque / (1.5 * c.pole_pairs * rotor_flux * rotor_flux);
}

}  // namespace slipbench::linear
