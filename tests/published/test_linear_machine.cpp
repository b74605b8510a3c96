// The machine as a linear system: exact Jacobians against central differences of the plant's own equations, its transfer against the
// circuit, names and shapes.
#include <Eigen/Dense>
#include <catch2/catch.hpp>

#include "plant/drive.hpp"
#include "plant/linear/linearise.hpp"
#include "plant/linear/machine_system.hpp"
#include "tests/published/machines.hpp"

using namespace slipbench;
using namespace slipbench::published;
using linear::Matrix;

namespace {

// d(i, psi_r, w)/dt in the frame that turns at w_k, by way of the whole drive's equations (plant/drive.hpp) in stator and rotor flux.
std::array<double, 5> rate(const linear::MachinePoint& at, std::array<double, 5> x, const std::array<double, 3>& u) {
  Drive<double> drive;
  drive.supply = Supply::inverter;
  drive.inverter_ideal = true;
  drive.opposed = false;
  drive.machine = make_machine(at.circuit);
  drive.shaft = {1.0 / at.inertia_kgm2, at.damping, 0.0, 1.0};
  const double L_s = at.circuit.stator_inductance(), L_r = at.circuit.rotor_inductance(),
               L_m = at.circuit.magnetizing_inductance, sigma_L = L_s - L_m * L_m / L_r;
  const Vec2<double> i{x[0], x[1]}, psi_r{x[2], x[3]}, psi_s = sigma_L * i + (L_m / L_r) * psi_r;
  DriveInput<double> in;
  in.ideal_voltage = {u[0], u[1]};
  in.load_profile = {u[2], 0.0};
  const auto d = drive_derivative(drive, in, {psi_s.x, psi_s.y, psi_r.x, psi_r.y, x[4], 0.0}, 0.0);
  const Vec2<double> rotor = Vec2<double>{d[2], d[3]} - at.frame_frequency * quarter_turn(psi_r);
  const Vec2<double> stator = Vec2<double>{d[0], d[1]} - at.frame_frequency * quarter_turn(psi_s);
  const Vec2<double> current = (1.0 / sigma_L) * (stator - (L_m / L_r) * rotor);
  return {current.x, current.y, rotor.x, rotor.y, d[4]};
}

linear::MachinePoint at_slip(const Published& p, double slip) {
  const double w = 2.0 * 3.14159265358979323846 * p.frequency, peak = p.line_voltage * std::sqrt(2.0 / 3.0);
  linear::MachinePoint at = linear::point_of(p.circuit, steady_at_slip(p.circuit, peak, w, slip));
  at.inertia_kgm2 = p.inertia;
  at.damping = 0.01;
  return at;
}

}  // namespace

TEST_CASE("linearise: the machine's Jacobians equal central differences of the drive's equations",
          "[published][linear]") {
  for (const Published& p : four()) {
    for (const double slip : {-0.05, 0.0, 0.03, 1.0}) {
      const linear::MachinePoint at = at_slip(p, slip);
      const linear::System s = linear::machine_on_shaft(at, true);
      const std::array<double, 5> x0{at.current.x, at.current.y, at.rotor_flux.x, at.rotor_flux.y, at.speed_rad_s};
      INFO(p.name << ", slip " << slip);
      for (Eigen::Index c = 0; c < 8; ++c) {
        auto above = x0, below = x0;
        std::array<double, 3> u_above{}, u_below{};
        // The equations are of second degree, so a central difference errs by rounding alone: 1e-15 of terms up to 1e5 times larger than
        // the entries, over the step.
        const double h = 1e-2;
        (c < 5 ? above[static_cast<std::size_t>(c)] : u_above[static_cast<std::size_t>(c - 5)]) += h;
        (c < 5 ? below[static_cast<std::size_t>(c)] : u_below[static_cast<std::size_t>(c - 5)]) -= h;
        const auto high = rate(at, above, u_above), low = rate(at, below, u_below);
        for (Eigen::Index r = 0; r < 5; ++r) {
          const double slope = (high[static_cast<std::size_t>(r)] - low[static_cast<std::size_t>(r)]) / (2.0 * h);
          CHECK((c < 5 ? s.A(r, c) : s.B(r, c - 5)) == Approx(slope).epsilon(1e-9).margin(1e-7));
        }
      }
    }
  }
}

TEST_CASE("linear machine: current per volt at supply frequency is one over the circuit's impedance",
          "[published][linear]") {
  // Z(s) = R_s + j w L_s + s w^2 L_m^2 / (R_r + j s w L_r): W. Leonhard, "Control of Electrical Drives"; any text. In the frame that turns
  // with the supply a steady voltage stands still: i = -C A^-1 B u. Condition of A below 1e5: 1e-10 holds.
  const Published p = krause_3hp();
  const linear::MachinePoint at = at_slip(p, p.slip);
  const linear::System s = linear::machine_at_speed(at);
  const Matrix gain = -s.C * s.A.fullPivLu().solve(s.B);
  const double w = at.frame_frequency, slip = p.slip;
  const Circuit<double>& c = p.circuit;
  const std::complex<double> j(0.0, 1.0);
  const auto Z = c.stator_resistance + j * w * c.stator_inductance() +
                 slip * w * w * c.magnetizing_inductance * c.magnetizing_inductance /
                     (c.rotor_resistance + j * slip * w * c.rotor_inductance());
  const auto per_volt = 1.0 / Z;
  CHECK(gain(0, 0) == Approx(per_volt.real()).epsilon(1e-10));
  CHECK(gain(1, 0) == Approx(per_volt.imag()).epsilon(1e-10));
  CHECK(gain(0, 1) == Approx(-per_volt.imag()).epsilon(1e-10));
}

TEST_CASE("linear machine: names tell frame and units; what is not given is refused", "[published][linear]") {
  linear::MachinePoint at = at_slip(krause_3hp(), 0.05);
  const linear::System s = linear::machine_on_shaft(at, true), blind = linear::machine_on_shaft(at, false);
  using Names = std::vector<std::string>;
  CHECK(s.state_names == Names{"i_d_A", "i_q_A", "psi_d_Wb", "psi_q_Wb", "speed_rad_s"});
  CHECK(s.input_names == Names{"u_d_V", "u_q_V", "load_torque_Nm"});
  CHECK(s.output_names == Names{"i_d_A", "i_q_A", "speed_rad_s"});
  CHECK(blind.output_names == Names{"i_d_A", "i_q_A"});
  CHECK_NOTHROW(linear::checked(s));
  CHECK_NOTHROW(linear::checked(blind));
  CHECK_NOTHROW(linear::checked(linear::machine_at_speed(at)));
  at.frame_frequency = 0.0;
  CHECK(linear::machine_at_speed(at).state_names[0] == "i_alpha_A");
  at.inertia_kgm2 = 0.0;
  CHECK_THROWS_WITH(linear::machine_on_shaft(at, true), Catch::Contains("inertia"));
}

TEST_CASE("linearise: a pendulum's matrices in closed form", "[linear]") {
  // x = (angle, rate), x_2' = -g/l sin x_1 - d x_2 + u^2, y = x_1 x_2: derivatives by hand.
  const auto f = []<class Real>(const std::array<Real, 2>& x, const std::array<Real, 1>& u) {
    return std::array<Real, 2>{x[1], -(Real(9.81) * sincos(x[0]).sin) - Real(0.3) * x[1] + u[0] * u[0]};
  };
  const auto h = []<class Real>(const std::array<Real, 2>& x, const std::array<Real, 1>&) {
    return std::array<Real, 1>{x[0] * x[1]};
  };
  const linear::System s = linear::linearise(f, h, std::array{0.5, 2.0}, std::array{1.5});
  CHECK(s.A(0, 1) == 1.0);
  CHECK(s.A(1, 0) == Approx(-9.81 * std::cos(0.5)).epsilon(1e-15));
  CHECK(s.A(1, 1) == -0.3);
  CHECK(s.B(1, 0) == 3.0);
  CHECK(s.C(0, 0) == 2.0);
  CHECK(s.C(0, 1) == 0.5);
  CHECK(s.D(0, 0) == 0.0);
}
