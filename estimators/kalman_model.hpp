// What the extended Kalman filter believes about a step ahead: the discrete model, its Jacobian written by
// hand, and the symmetric matrices it works on.
//
// With A(w) = A0 + w A1 and the held voltage, f = A x + b u, the series x + T f + T^2/2 A f + T^3/6 A^2 f
// gives
//   d/dx = 1 + T A + T^2/2 A^2 + T^3/6 A^3                (complex 2 x 2: alpha-beta pairs commute with j)
//   d/dw = T d1 + T^2/2 d2 + T^3/6 d3,   d1 = A1 x,  d2 = A1 f + A d1,  d3 = A1 A f + A d2
// x = (i A, psi_R Wb), w electrical rad/s, T s. Source: product rule on estimators/believed_machine.hpp.
#pragma once

#include "estimators/believed_machine.hpp"

namespace slipbench {

template <class Real>
struct KalmanVector {
  Vec2<Real> current, flux;  // A, psi_R Wb
  Real speed{};              // electrical rad/s
  Real load_torque{};        // N m
  SLIPBENCH_FIELDS(current, flux, speed, load_torque)
};
template <class Real>
KalmanVector<Real> select(const MaskOf<Real>& mask, const KalmanVector<Real>& yes, const KalmanVector<Real>& no) {
  return {select(mask, yes.current, no.current), select(mask, yes.flux, no.flux), select(mask, yes.speed, no.speed),
          select(mask, yes.load_torque, no.load_torque)};
}

template <class Real>
struct KalmanModel {
  BelievedMachine<Real> machine;
  Real speed_per_torque{};  // T p / J, 0 when speed is a random walk
  Real damping{};           // T b / J, likewise
  SLIPBENCH_FIELDS(machine, speed_per_torque, damping)
};

// Whether speed and load torque follow the shaft: a choice of the settings, the same in all lanes. Without it the load's row and
// column stay what they were, zero, and are not computed.
template <class Real>
bool has_load(const KalmanModel<Real>& model) {
  return any(model.speed_per_torque > Real(0.0));
}

// Symmetric 6 x 6: each entry is computed once and written to both places, so symmetric by construction.
template <class Real>
struct Symmetric6 {
  Mat<Real, 6, 6> entry{};
  SLIPBENCH_FIELDS(entry)
  const Real& operator()(std::size_t r, std::size_t c) const { return entry[r][c]; }
  void set(std::size_t r, std::size_t c, const Real& value) { entry[r][c] = entry[c][r] = value; }
};

// name_rc for each entry, one digit a place.
template <class Real, std::size_t N, std::size_t M>
void label_entries([[maybe_unused]] const char* name, [[maybe_unused]] const Mat<Real, N, M>& m) {
  if constexpr (Notes<Real>::kept)
    each_named(std::string(name) + "_", m, [](const std::string& n, const Real& x) { label(n.c_str(), x); });
}

// The Jacobian's parts that are neither 0 nor 1.
template <class Real>
struct KalmanJacobian {
  Mat<Real, 4, 5> electrical;  // d(i, psi)+ / d(i, psi, w)
  std::array<Real, 6> speed;   // dw+ / dx; the load's row is that of the identity
};
template <class Real>
struct KalmanPrediction {
  KalmanVector<Real> x;
  KalmanJacobian<Real> F;
};

// Complex 2 x 2 over (i, psi).
template <class Real>
struct ComplexBlock {
  Vec2<Real> ii, ip, pi, pp;
};

template <class Real>
KalmanPrediction<Real> predict_with_jacobian(const KalmanModel<Real>& model, const KalmanVector<Real>& x,
                                             const Vec2<Real>& u) {
  const BelievedMachine<Real>& m = model.machine;
  const Real one(1.0), T = m.period, half_T = Real(0.5) * T, third_T = Real(1.0 / 3.0) * T;
  const CurrentAndFlux<Real> now{x.current, x.flux};
  const Ahead<Real> next = ahead(m, now, u, x.speed);

  section<Real>("Jacobian by (i, psi): phi = 1 + T A (1 + T/2 A (1 + T/3 A)), complex 2 x 2");
  // A = [a, e / L_sigma; R_R, -e] with a = -(R_s + R_R) / L_sigma, e = alpha - j w.
  const Real a = -m.per_L_sigma * (m.R_s + m.R_R);
  const Vec2<Real> e{m.alpha, -x.speed}, e_L = m.per_L_sigma * e;
  const auto one_plus = [&](const Real& h, const ComplexBlock<Real>& b) {  // 1 + h A b
    ComplexBlock<Real> r{h * (a * b.ii + product(e_L, b.pi)), h * (a * b.ip + product(e_L, b.pp)),
                         h * (m.R_R * b.ii - product(e, b.pi)), h * (m.R_R * b.ip - product(e, b.pp))};
    r.ii.x = r.ii.x + one;
    r.pp.x = r.pp.x + one;
    return r;
  };
  const Real h3a = third_T * a, h3R = third_T * m.R_R;
  label_alpha_beta("e", e);
  label_alpha_beta("e_L", e_L);
  const ComplexBlock<Real> inner{
      {one + h3a, Real(0.0)}, third_T * e_L, {h3R, Real(0.0)}, {one - third_T * e.x, -(third_T * e.y)}};
  const ComplexBlock<Real> phi = one_plus(T, one_plus(half_T, inner));
  label_alpha_beta("phi_ii", phi.ii);
  label_alpha_beta("phi_ip", phi.ip);
  label_alpha_beta("phi_pi", phi.pi);
  label_alpha_beta("phi_pp", phi.pp);

  const auto by_speed = [&](const Vec2<Real>& flux) {  // A1 (i, psi)
    const Vec2<Real> turned = quarter_turn(flux);
    return CurrentAndFlux<Real>{-m.per_L_sigma * turned, turned};
  };
  section<Real>("Jacobian by w: T d1 + T^2/2 d2 + T^3/6 d3,  d1 = A1 x,  d2 = A1 f + A d1,  d3 = A1 A f + A d2");
  const CurrentAndFlux<Real> d1 = by_speed(now.flux);
  const CurrentAndFlux<Real> d2 = by_speed(next.first.flux) + unforced(m, d1, x.speed);
  const CurrentAndFlux<Real> d3 = by_speed(next.second.flux) + unforced(m, d2, x.speed);
  const CurrentAndFlux<Real> dw = T * (d1 + half_T * (d2 + third_T * d3));

  label_alpha_beta("di_dw", dw.current);
  label_alpha_beta("dpsi_dw", dw.flux);
  section<Real>("w+ = w + T p / J (torque - load - b w / p), and its row of the Jacobian");

  KalmanPrediction<Real> out;
  out.F.electrical = {{{phi.ii.x, -phi.ii.y, phi.ip.x, -phi.ip.y, dw.current.x},
                       {phi.ii.y, phi.ii.x, phi.ip.y, phi.ip.x, dw.current.y},
                       {phi.pi.x, -phi.pi.y, phi.pp.x, -phi.pp.y, dw.flux.x},
                       {phi.pi.y, phi.pi.x, phi.pp.y, phi.pp.x, dw.flux.y}}};
  const Real k = model.speed_per_torque, kt = k * m.torque_factor;
  out.F.speed = {-kt * x.flux.y, kt * x.flux.x, kt * x.current.y, -kt * x.current.x, one - model.damping, -k};
  out.x.current = next.state.current;
  out.x.flux = next.state.flux;
  out.x.speed = x.speed;
  if (has_load(model))
    out.x.speed = x.speed + k * (m.torque_factor * cross(x.flux, x.current) - x.load_torque) - model.damping * x.speed;
  out.x.load_torque = x.load_torque;
  label("w_ahead", out.x.speed);
  return out;
}

// F P F'. Rows 0..3 of F reach columns 0..4, row 4 all, row 5 is the identity's; sums run upwards. Without `load` row 4 is
// the identity's too, and what belongs to the load is left alone.
template <class Real>
Symmetric6<Real> sandwich(const KalmanJacobian<Real>& F, const Symmetric6<Real>& P, bool load) {
  Mat<Real, 6, 6> FP;
  section<Real>("F P");
  for (std::size_t c = 0; c < 6; ++c) {
    if (c == 5 && !load) continue;
    for (std::size_t r = 0; r < 4; ++r) {
      Real sum = F.electrical[r][0] * P(0, c);
      for (std::size_t k = 1; k < 5; ++k) sum = sum + F.electrical[r][k] * P(k, c);
      FP[r][c] = sum;
    }
    FP[4][c] = P(4, c);
    if (load) {
      Real sum = F.speed[0] * P(0, c);
      for (std::size_t k = 1; k < 6; ++k) sum = sum + F.speed[k] * P(k, c);
      FP[4][c] = sum;
    }
    FP[5][c] = P(5, c);
  }
  label_entries("FP", FP);
  section<Real>("(F P) F', each entry once");
  Symmetric6<Real> out;
  for (std::size_t r = 0; r < 6; ++r) {
    for (std::size_t c = r; c < 4; ++c) {
      Real sum = FP[r][0] * F.electrical[c][0];
      for (std::size_t k = 1; k < 5; ++k) sum = sum + FP[r][k] * F.electrical[c][k];
      out.set(r, c, sum);
    }
    if (!load) {
      if (r <= 4) out.set(r, 4, FP[r][4]);
      out.set(r, 5, P(r, 5));
      continue;
    }
    if (r <= 4) {
      Real sum = FP[r][0] * F.speed[0];
      for (std::size_t k = 1; k < 6; ++k) sum = sum + FP[r][k] * F.speed[k];
      out.set(r, 4, sum);
    }
    out.set(r, 5, FP[r][5]);
  }
  return out;
}

// Scales row and column n so that P(n, n) <= most: D P D, so P stays positive.
template <class Real>
void bound_variance(Symmetric6<Real>& P, std::size_t n, const Real& most) {
  const Real tiny(1e-30), one(1.0);
  section<Real>(n == 4 ? "variance of the speed at most so much: D P D" : "variance of the load torque likewise");
  const MaskOf<Real> beyond = P(n, n) > most;
  if (surely_none(beyond)) return;
  const Real scale = select(beyond, sqrt(most / max(P(n, n), tiny)), one);
  SLIPBENCH_LABEL(beyond, scale)
  for (std::size_t k = 0; k < 6; ++k) P.set(n, k, scale * P(n, k));
  P.set(n, n, scale * P(n, n));
}

}  // namespace slipbench
