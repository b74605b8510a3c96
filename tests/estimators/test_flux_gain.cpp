// The gain against the observer's equations written out anew with complex numbers.
#include <catch2/catch.hpp>
#include <complex>

#include "estimators/believed_machine.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;
using C = std::complex<double>;

namespace {

// Rate of the error e = psi_hat - psi, seen from the estimated flux turning at w_s, for a given current and
// w_r.
C error_rate(C psi_hat, C error, C current, double w_s, double w_r, double R_R, double alpha, C g) {
  const C j(0.0, 1.0), psi = psi_hat - error, along = psi_hat / std::abs(psi_hat);
  const C emf = R_R * current - (alpha - j * w_r) * psi;
  const double expected = R_R * (std::conj(along) * current).real() - alpha * std::abs(psi_hat);
  const C psi_hat_rate = emf + g * along * (expected - (std::conj(along) * emf).real());
  return std::conj(along) * (psi_hat_rate - emf) - j * w_s * std::conj(along) * error;
}

}  // namespace

TEST_CASE("flux gain: trace and determinant of the error dynamics are the chosen ones", "[estimators][closed_form]") {
  const double zeta = 0.7, stiffness = 1.0, cap_Hz = 15.0;
  const EstimatorSetup setup = setup_of(barut_3kW());
  FluxGain<double> k = flux_gain_for(setup, zeta, stiffness, cap_Hz);
  k.most_slip = 1e9;  // the law itself, any slip
  const double alpha = believe(setup).alpha, R_R = believe(setup).R_R;
  for (double w_s : {-500.0, -60.0, -3.14, 0.0, 3.14, 20.0, 400.0}) {
    for (double w_r : {-450.0, -10.0, 0.0, 3.0, 80.0, 500.0}) {
      const Vec2<double> g = flux_gain(k, 0.85, w_s, w_r);  // at nominal flux
      // Error dynamics are linear: columns from unit errors, any current and flux direction.
      const C psi_hat = 0.85 * std::polar(1.0, 0.6), current(4.0, -7.0), along = psi_hat / std::abs(psi_hat);
      const C x = error_rate(psi_hat, 1e-3 * along, current, w_s, w_r, R_R, alpha, {g.x, g.y}) / 1e-3;
      const C y = error_rate(psi_hat, C(0.0, 1e-3) * along, current, w_s, w_r, R_R, alpha, {g.x, g.y}) / 1e-3;
      const double trace = x.real() + y.imag(), determinant = x.real() * y.imag() - x.imag() * y.real();
      const double a = alpha + 2.0 * zeta * std::min(std::fabs(w_s), rad_per_turn * cap_Hz);
      const double b = stiffness * alpha * w_s / (std::fabs(w_s) + rad_per_turn * 0.2);
      // Rounding alone: differences of terms up to |g| w_r ~ 1e3, squared ~ 1e6, over a step of 1e-3.
      INFO("w_s " << w_s << " w_r " << w_r);
      CHECK(trace == Approx(-a).epsilon(1e-9).margin(1e-7));
      CHECK(determinant == Approx(w_s * w_s + w_s * b).epsilon(1e-8).margin(1e-4));
      CHECK(std::isfinite(g.x));
      CHECK(std::isfinite(g.y));
    }
  }
}

TEST_CASE("flux gain: fades with the flux and stays bounded at impossible slips", "[estimators]") {
  const EstimatorSetup setup = setup_of(krishnan_5hp());
  const FluxGain<double> k = flux_gain_for(setup, 0.7, 1.0, 15.0);
  const double flux = nominal_rotor_flux(setup), w_s = 300.0;
  const Vec2<double> full = flux_gain(k, flux, w_s, w_s - 5.0), quarter = flux_gain(k, 0.25 * flux, w_s, w_s - 5.0);
  CHECK(quarter.x == Approx(0.25 * full.x));
  CHECK(quarter.y == Approx(0.25 * full.y));
  CHECK(magnitude(flux_gain(k, flux, w_s, 0.0)) < 2.0 * magnitude(full));  // not 2 zeta w_cap / alpha = 40 times
  CHECK(magnitude(flux_gain(k, 0.0, w_s, w_s)) == 0.0);
}
