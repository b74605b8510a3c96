#include "sim/engine/plant.hpp"

#include <algorithm>

namespace slipbench {

namespace {

constexpr double rad_s_per_rpm = 3.14159265358979323846 / 30.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
// A healthy drive stays far inside these multiples of its ratings; beyond them the run has diverged.
constexpr double flux_ceiling = 100.0, speed_ceiling = 100.0;

constexpr double Circuit<double>::*circuit_member(std::string_view quantity) {
  if (quantity == "stator_resistance") return &Circuit<double>::stator_resistance;
  if (quantity == "rotor_resistance") return &Circuit<double>::rotor_resistance;
  if (quantity == "magnetizing_inductance") return &Circuit<double>::magnetizing_inductance;
  if (quantity == "stator_leakage") return &Circuit<double>::stator_leakage;
  if (quantity == "rotor_leakage") return &Circuit<double>::rotor_leakage;
  return nullptr;
}

// Everything of one step in one function: the calls of four stages would cost as much as their arithmetic. The supply's
// voltage is reckoned once a time, whether stages or the next step ask again.
[[gnu::flatten]] void advance(const Drive<double>& drive, const DriveInput<double>& input, SourceAt& known,
                              Stepper method, DriveState<double>& x, double t, double h) {
  SourceAt source = known;
  const auto system = [&](const DriveState<double>& at, DriveState<double>& dx, double time) {
    if (time != source.time) source = {time, source_voltage(drive, input, time)};
    dx = drive_derivative(drive, input, source.voltage, at, time);
  };
  odeint_step(method, system, x, t, h);
  known = source;
}

}  // namespace

Plant::Plant(const Scenario& s, std::uint32_t noise_run)
    : circuit_(s.machine.circuit()),
      inertia_(s.shaft.inertia_kgm2),
      dc_link_(s.supply.dc_link_V),
      step_s_(s.run.plant_step_s),
      circuit_now_(circuit_),
      process_noise_(s.process_noise),
      noise_(s.seed, noise_run) {
  const Nameplate plate = s.machine.nameplate();
  flux_limit_ = flux_ceiling * plate.phase_peak_V() / plate.angular_frequency();
  speed_limit_ = speed_ceiling * plate.speed_rad_s();
  method_ = stepper_named(s.run.method).value();
  drive_.supply = s.on_mains() ? Supply::mains : Supply::inverter;
  drive_.machine = make_machine(circuit_);
  const double width = s.shaft.friction_width_rpm * rad_s_per_rpm;
  drive_.shaft = {1.0 / inertia_, s.shaft.viscous_friction_Nms, s.shaft.coulomb_friction_Nm, 1.0 / width};
  for (const auto& load : s.loads) {
    if (load.kind == "profile") loads_.emplace_back(load.torque_profile, 1.0);
    if (load.kind == "constant_torque") drive_.load.opposing += load.torque_Nm;
    if (load.kind == "fan") drive_.load.fan += load.rated_torque_Nm / square(load.rated_speed_rpm * rad_s_per_rpm);
    if (load.kind == "imposed_speed") {
      drive_.speed_imposed = true;
      imposed_ = Profile(load.speed_rpm, rad_s_per_rpm);
    }
  }
  if (drive_.supply == Supply::mains) {
    drive_.mains = make_mains(s.supply.line_voltage_V, s.supply.frequency_Hz, s.supply.phase_deg);
  } else {
    drive_.inverter_ideal = s.supply.dead_time_s == 0.0 && s.supply.device_drop_V == 0.0;
    drive_.leg = leg_error(s.supply.dead_time_s, s.supply.switching_frequency_Hz, s.supply.device_drop_V,
                           s.supply.zero_current_width_A);
  }
  drive_.opposed = drive_.load.opposing != 0.0 || drive_.shaft.coulomb != 0.0;
  for (const auto& d : s.drifts) {
    drifts_.push_back({circuit_member(d.quantity), d.quantity == "inertia", d.quantity == "dc_link",
                       Profile(d.factor, 1.0, 1.0), 1.0});
  }
  walk_per_tick_ = process_noise_.load_torque_Nm * sqrt(s.run.control_period_s);
  dc_link_now_ = dc_link_;
  apply(duty_);
  set_drift(0.0, 0.5 * step_s_);
  set_state({}, s.run.initial_speed_rpm * rad_s_per_rpm);
}

void Plant::set_state(const MachineFlux<double>& flux, double speed) {
  x_ = {flux.stator.x, flux.stator.y, flux.rotor.x, flux.rotor.y, drive_.speed_imposed ? imposed_at(0) : speed, x_[5]};
}

double Plant::imposed_at(std::int64_t n) {
  const double t = static_cast<double>(std::max<std::int64_t>(n, 0)) * step_s_;
  return imposed_.line_at(t + 0.5 * step_s_).at(t);
}

void Plant::apply(const Phases<double>& duty) {
  duty_ = duty;
  apply_duty(drive_, input_, duty, dc_link_now_);
  source_ = {};
}

void Plant::disturb(std::int64_t tick) {
  if (tick <= 0) return;
  constexpr NoiseChannel load("process_load_torque"), current_alpha("process_current_alpha"),
      current_beta("process_current_beta"), flux_alpha("process_flux_alpha"), flux_beta("process_flux_beta");
  if (walk_per_tick_ > 0.0) input_.noise_torque += walk_per_tick_ * noise_.sample(load, tick);
  const double a = process_noise_.current_A, f = process_noise_.flux_Wb;
  if (a == 0.0 && f == 0.0) return;
  MachineFlux<double> psi = flux_of(x_);
  Vec2<double> i_s = stator_current(drive_.machine, psi);
  if (a > 0.0) i_s = i_s + a * Vec2<double>{noise_.sample(current_alpha, tick), noise_.sample(current_beta, tick)};
  if (f > 0.0)
    psi.rotor = psi.rotor + f * Vec2<double>{noise_.sample(flux_alpha, tick), noise_.sample(flux_beta, tick)};
  psi.stator = (1.0 / drive_.machine.per_Ls) * (i_s + drive_.machine.per_Lm * psi.rotor);
  x_ = {psi.stator.x, psi.stator.y, psi.rotor.x, psi.rotor.y, x_[4], x_[5]};
}

void Plant::set_drift(double t, double on_line_at) {
  bool moved = false;
  for (auto& drift : drifts_) {
    const double factor = drift.factor.line_at(on_line_at).at(t);
    moved = moved || factor != drift.now;
    drift.now = factor;
  }
  if (!moved) return;
  circuit_now_ = circuit_;
  double inertia = inertia_, dc_link = dc_link_;
  for (const auto& drift : drifts_) {
    if (drift.circuit) circuit_now_.*drift.circuit *= drift.now;
    if (drift.inertia) inertia *= drift.now;
    if (drift.dc_link) dc_link *= drift.now;
  }
  drive_.machine = make_machine(circuit_now_);
  drive_.shaft.per_inertia = 1.0 / inertia;
  if (dc_link != dc_link_now_) {
    dc_link_now_ = dc_link;
    apply(duty_);
  }
}

void Plant::set_lines(std::int64_t n) {
  const double middle = (static_cast<double>(n) + 0.5) * step_s_;
  const auto line = [&](Profile& p) {
    return n < 0 ? Line<double>{p.line_at(0.0).at(0.0), 0.0, 0.0} : p.line_at(middle);
  };
  if (!loads_.empty()) {
    Line<double> sum = line(loads_.front());
    for (std::size_t i = 1; i < loads_.size(); ++i) {
      const Line<double> more = line(loads_[i]);
      sum.value += more.at(sum.start);
      sum.slope += more.slope;
    }
    input_.load_profile = sum;
  }
  if (drive_.speed_imposed) input_.imposed_speed = line(imposed_);
}

void Plant::step(std::int64_t n) {
  const double t = static_cast<double>(n) * step_s_;
  const double middle = std::max(t + 0.5 * step_s_, 0.0);
  set_drift(middle, middle);
  set_lines(n);
  advance(drive_, input_, source_, method_, x_, t, step_s_);
  // What sensors and rows see at the step's end is the value just after a jump there.
  const double end = static_cast<double>(std::max<std::int64_t>(n + 1, 0)) * step_s_;
  set_drift(end, end + 0.5 * step_s_);
  if (drive_.speed_imposed) x_[4] = imposed_at(n + 1);
}

Vec2<double> Plant::voltage_at(std::int64_t n) const {
  const Vec2<double> source = source_voltage(drive_, input_, static_cast<double>(n) * step_s_);
  return stator_voltage(drive_, input_, source, stator_current(drive_.machine, flux_of(x_)));
}

double Plant::load_at_start(double speed) const {
  DriveInput<double> in = input_;
  in.load_profile = {};
  for (Profile p : loads_) in.load_profile.value += p.line_at(0.0).at(0.0);
  return total_resistance(drive_, in, speed, 0.0);
}

PlantRow Plant::row(std::int64_t n) {
  const double t = static_cast<double>(n) * step_s_;
  set_lines(n);
  const MachineFlux<double> psi = flux_of(x_);
  const Machine<double>& m = drive_.machine;
  const Vec2<double> i_s = stator_current(m, psi), i_r = rotor_current(m, psi), u = voltage_at(n);
  const double flux = magnitude(psi.rotor);
  // Along and across the rotor flux; at no flux at all the frame's angle is 0.
  const Vec2<double> along = flux > 0.0 ? (1.0 / flux) * psi.rotor : Vec2<double>{1.0, 0.0};
  const Vec2<double> i_dq = seen_from(along, i_s);
  const double slip = flux > 0.0 ? -m.R_r * cross(psi.rotor, i_r) / (flux * flux) : 0.0;
  const double speed = x_[4];
  const Phases<double> i = phases_of(i_s);
  PlantRow row;
  row[P::time] = t;
  row[P::speed_rpm] = speed / rad_s_per_rpm;
  row[P::speed_reference_rpm] = nan;
  row[P::torque] = torque(m, psi, i_s);
  row[P::load_torque] = total_load(drive_, input_, speed, t);
  row[P::stator_frequency] = (m.pole_pairs * speed + slip) * 0.15915494309189533577;
  row[P::u_alpha] = u.x;
  row[P::u_beta] = u.y;
  row[P::i_alpha] = i_s.x;
  row[P::i_beta] = i_s.y;
  row[P::i_d] = i_dq.x;
  row[P::i_q] = i_dq.y;
  row[P::i_a] = i.a;
  row[P::i_b] = i.b;
  row[P::i_c] = i.c;
  row[P::rotor_flux] = flux;
  row[P::rotor_flux_angle] = atan2(along.y, along.x);
  row[P::rotor_flux_reference] = nan;
  row[P::dc_link] = drive_.supply == Supply::mains ? nan : dc_link_now_;
  row[P::stator_resistance] = m.R_s;
  row[P::rotor_resistance] = m.R_r;
  return row;
}

const char* Plant::diverged() const {
  const auto lost = [](double x, double limit) { return !(fabs(x) <= limit); };  // NaN counts as lost
  if (lost(x_[0], flux_limit_) || lost(x_[1], flux_limit_)) return "stator flux of the plant";
  if (lost(x_[2], flux_limit_) || lost(x_[3], flux_limit_)) return "rotor flux of the plant";
  if (lost(x_[4], speed_limit_)) return "speed of the plant";
  return nullptr;
}

}  // namespace slipbench
