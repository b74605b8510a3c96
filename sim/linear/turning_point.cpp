#include "sim/linear/turning_point.hpp"

#include <Eigen/LU>
#include <complex>

#include "plant/linear/machine_system.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench {
namespace {

using C = std::complex<double>;
using Matrix2 = Eigen::Matrix2cd;
using Vector2 = Eigen::Vector2cd;

C complex(const Vec2<double>& v) { return {v.x, v.y}; }
Vec2<double> vector(C z) { return {z.real(), z.imag()}; }

}  // namespace

TurningPoint turning_point(const Circuit<double>& circuit, double T, double rotor_flux, double torque, double w_r) {
  const Machine<double> m = make_machine(circuit);
  const Vec2<double> o{}, one{1.0, 0.0};
  const auto column = [&](const Vec2<double>& i, const Vec2<double>& psi, const Vec2<double>& u) {
    const auto rate = linear::current_flux_rate(m, 0.0, i, psi, u, w_r);
    return Vector2(complex(rate.current), complex(rate.flux));
  };
  Matrix2 A;
  A.col(0) = column(one, o, o);
  A.col(1) = column(o, one, o);
  const Vector2 B = column(o, o, one);

  // Series of e^{AT} and of its integral, with halving so that the terms fall fast: (1 + E)(1 + E) = 1 + 2 E + E^2, and
  // Gamma(2 t) = (1 + Phi(t)) Gamma(t).
  int halvings = 0;
  double t = T;
  for (; A.norm() * t > 0.5 && halvings < 60; ++halvings) t *= 0.5;
  Matrix2 term = Matrix2::Identity(), Phi = term, Integral = t * term;
  for (int k = 1; k < 20; ++k) {  // 0.5^20 / 20! is far below rounding
    term = (t / k) * (A * term).eval();
    Phi += term;
    Integral += (t / (k + 1)) * term;
  }
  for (int k = 0; k < halvings; ++k) {
    Integral += (Phi * Integral).eval();
    Phi = (Phi * Phi).eval();
  }
  const Vector2 Gamma = Integral * B;

  TurningPoint p;
  p.period_s = T;
  p.w_r = w_r;
  p.torque_Nm = torque;
  p.pole_pairs = circuit.pole_pairs;
  p.flux_ratio = to_inverse_gamma(circuit).flux_ratio;
  p.rotor_flux = {rotor_flux, 0.0};
  const SteadyState s = steady_at_flux(circuit, rotor_flux, torque, w_r);
  p.w_s = s.stator_frequency;
  // (turn - Phi)(i, psi) = Gamma u with psi given: i and u unknown.
  const SinCos<double> angle = sincos(p.w_s * T);
  const C turn(angle.cos, angle.sin);
  Matrix2 unknown;
  unknown.col(0) = Vector2(turn, 0.0) - Phi.col(0);
  unknown.col(1) = -Gamma;
  const Vector2 iu = unknown.fullPivLu().solve(Vector2(rotor_flux * (Phi.col(1) - Vector2(0.0, turn))));
  p.current = vector(iu(0));
  p.voltage = vector(iu(1) / turn);  // iu(1) acts over [0, 1)
  return p;
}

}  // namespace slipbench
