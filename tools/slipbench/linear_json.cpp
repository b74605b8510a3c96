#include "tools/slipbench/linear_json.hpp"

#include <cmath>
#include <nlohmann/json.hpp>

#include "tools/slipbench/analysis.hpp"
#include "tools/slipbench/design_result.hpp"
#include "tools/slipbench/linear_text.hpp"

namespace slipbench {

namespace {

using Json = nlohmann::ordered_json;
using linear::Complex;
using linear::Matrix;

Json number(double x) { return std::isfinite(x) ? Json(x) : Json(nullptr); }
Json number(const std::optional<double>& x) { return x ? number(*x) : Json(nullptr); }
Json pole(Complex p) { return Json::array({number(p.real()), number(p.imag())}); }

Json poles(const std::vector<Complex>& all) {
  Json list = Json::array();
  for (const Complex& p : all) list.push_back(pole(p));
  return list;
}

Json matrix(const Matrix& m) {
  Json rows = Json::array();
  for (Eigen::Index i = 0; i < m.rows(); ++i) {
    Json row = Json::array();
    for (Eigen::Index j = 0; j < m.cols(); ++j) row.push_back(number(m(i, j)));
    rows.push_back(std::move(row));
  }
  return rows;
}

Json matrices(const linear::System& s) {
  return {{"A", matrix(s.A)}, {"B", matrix(s.B)}, {"C", matrix(s.C)}, {"D", matrix(s.D)}};
}

std::string text_of(const Json& document) {
  return document.dump(2, ' ', false, Json::error_handler_t::replace) + "\n";
}

Json names(const linear::System& s) {
  return {{"states", state_names(s)}, {"inputs", input_names(s)}, {"outputs", output_names(s)}};
}

Json modes(const Analysis& a) {
  Json list = Json::array();
  for (std::size_t i = 0; i < a.modes.size() && i < a.tests.size(); ++i) {
    const linear::Mode& m = a.modes[i];
    const linear::ModeTest& t = a.tests[i];
    list.push_back({{"pole", pole(m.pole)},
                    {"damping", number(m.damping)},
                    {"frequency_rad_s", number(m.frequency_rad_s)},
                    {"time_constant_s", number(m.time_constant_s)},
                    {"controllable", t.controllable},
                    {"observable", t.observable},
                    {"controllability", number(t.controllability)},
                    {"observability", number(t.observability)},
                    {"tolerance", number(t.tolerance)}});
  }
  return list;
}

// In other coordinates, x = T z.
Json form(const linear::System& s, const Matrix& T, double condition) {
  Json one = matrices(s);
  one["T"] = matrix(T), one["condition"] = number(condition);
  return one;
}

Json discretisations(const Analysis& a) {
  Json list = Json::array();
  for (const auto& d : a.discretised) {
    if (!d) {
      list.push_back({{"refused", d.why}});
      continue;
    }
    Json one = {{"method", linear::name_of(d->method)},
                {"period_s", d->period_s},
                {"error_to_tenth_of_nyquist", number(d->error.response_to_tenth)},
                {"error_to_half_of_nyquist", number(d->error.response_to_half)},
                {"pole_error", number(d->error.pole)}};
    if (!d->error.warning.empty()) one["warning"] = d->error.warning;
    one.update(matrices(d->system));
    list.push_back(std::move(one));
  }
  return list;
}

Json at_frequency(const Analysis& a) {
  Json at = {{"frequency_Hz", a.at_Hz}, {"gain", nullptr}, {"phase_rad", nullptr}};
  if (!a.at) return at["why"] = a.at.why, at;
  at["gain"] = matrix(a.at->gain), at["phase_rad"] = matrix(a.at->phase_rad);
  return at;
}

}  // namespace

std::string linear_json(const Analysis& a) {
  Json d = {{"slipbench", SLIPBENCH_VERSION}, {"title", a.title}, {"what", a.what}, {"order", a.system.order()}};
  d.update(names(a.system));
  d["sample_period_s"] = a.system.discrete() ? Json(a.system.sample_period_s) : Json(nullptr);
  d["poles"] = Json::array();
  for (const linear::Mode& m : a.modes) d["poles"].push_back(pole(m.pole));
  d["stability"] = linear::name_of(a.verdict.stability);
  d["stability_why"] = a.verdict.why, d["stability_tolerance"] = number(a.verdict.tolerance);
  d["controllable_rank"] = a.ranks.controllable, d["observable_rank"] = a.ranks.observable;
  d["rank_tolerance"] = number(a.ranks.tolerance);
  d["minimal_order"] = a.minimal ? Json(a.minimal_order()) : Json(nullptr);
  d["stabilisable"] = a.stabilisable, d["stabilisable_why"] = a.stabilisable_why;
  d["detectable"] = a.detectable, d["detectable_why"] = a.detectable_why;
  d["modes"] = modes(a);
  d.update(matrices(a.system));
  d["minimal"] = nullptr;
  if (a.minimal) {
    d["minimal"] = matrices(a.minimal->system);
    d["minimal"]["removed"] = a.minimal->removed;
    d["minimal"]["residual"] = number(a.minimal->residual);
  }
  if (a.parts)
    d["parts"] = {{"controllable_observable", a.parts->controllable_observable},
                  {"controllable_only", a.parts->controllable_only},
                  {"observable_only", a.parts->observable_only},
                  {"neither", a.parts->neither}};
  d["kalman"] = a.parts ? form(a.parts->system, a.parts->T, a.parts->condition) : Json(nullptr);
  d["modal"] = a.modal ? form(a.modal->system, a.modal->T, a.modal->condition) : Json(nullptr);
  if (!a.modal) d["modal_why"] = a.modal.why;
  d["gramians"] = nullptr;
  if (a.gramians)
    d["gramians"] = {{"controllability", matrix(a.gramians->controllability)},
                     {"observability", matrix(a.gramians->observability)},
                     {"residual", number(a.gramians->residual)}};
  d["balanced"] = nullptr, d["hankel"] = nullptr;
  if (a.balanced) {
    d["balanced"] = matrices(a.balanced->system);
    d["hankel"] = Json::array();
    for (const double h : a.balanced->hankel) d["hankel"].push_back(number(h));
  }
  d["zeros"] = a.zeros ? poles(*a.zeros) : Json(nullptr);
  d["dc_gain"] = a.dc_gain ? matrix(*a.dc_gain) : Json(nullptr);
  if (!a.dc_gain) d["dc_gain_why"] = a.dc_gain.why;
  d["redundant"] = Json::array();
  for (const linear::Redundant& r : a.redundant) d["redundant"].push_back({{"variable", r.variable}, {"why", r.why}});
  if (a.at_Hz > 0.0) d["at"] = at_frequency(a);
  if (!a.discretised.empty()) d["discretisation"] = discretisations(a);
  if (!a.operating_point.empty()) {
    d["operating_point"] = Json::object();
    for (const OperatingValue& v : a.operating_point) d["operating_point"][v.column] = number(v.value);
  }
  d["warnings"] = a.warnings;
  return text_of(d);
}

namespace {

Json response(const DesignResult& r, const LoopRow& row) {
  const Loop& loop = r.loops[row.loop];
  Json one = {
      {"loop", loop.name},
      {"output", r.pi ? r.plant.output_name(0) : r.plant.output_name(r.tracked[static_cast<std::size_t>(row.pair)])},
      {"stable", loop.stable},
      {"why", loop.verdict}};
  const auto step = [&](const char* key, auto member, bool time) {
    const bool there = row.step && (!time || (*row.step).*member >= 0.0);
    one[key] = there ? number((*row.step).*member) : Json(nullptr);
  };
  step("final", &linear::StepFigures::final, false);
  step("overshoot", &linear::StepFigures::overshoot, false);
  step("peak_time_s", &linear::StepFigures::peak_time_s, true);
  step("rise_s", &linear::StepFigures::rise_s, true);
  step("settling_s", &linear::StepFigures::settling_s, true);
  step("steady_error", &linear::StepFigures::steady_error, false);
  one["peak_effort"] = number(row.effort);
  one["disturbance_peak"] = number(row.dip), one["disturbance_final"] = number(row.left);
  one["effort_noise_rms"] = number(row.noise);
  one["gain"] = number(row.gain), one["phase_deg"] = number(row.phase_deg);
  return one;
}

void add_pi(Json& d, const DesignResult& r) {
  const linear::PiTuning& t = *r.pi;
  d["pi"] = {{"gain", t.gain},
             {"integral_time_s", t.integral_time_s},
             {"prefilter_s", t.prefilter_s > 0.0 ? Json(t.prefilter_s) : Json(nullptr)},
             {"crossover_rad_s", number(t.crossover_rad_s)},
             {"phase_margin_rad", number(t.phase_margin_rad)},
             {"plant_gain", r.pi_gain},
             {"large_lag_s", r.pi_large_lag_s},
             {"small_lag_s", r.pi_small_lag_s}};
  d["closed_loop_poles"] = poles(t.poles);
}

}  // namespace

std::string linear_json(const DesignResult& r) {
  Json d = {{"slipbench", SLIPBENCH_VERSION}, {"title", r.title}, {"kind", name_of(r.kind)}};
  d.update(names(r.plant));
  if (r.pi) add_pi(d, r);
  if (r.controller) d["K"] = matrix(r.controller->K);
  if (r.controller && r.controller->P.size() > 0 && !r.is_observer()) d["P"] = matrix(r.controller->P);
  if (r.observer) d["L"] = matrix(r.observer->L);
  if (r.is_observer() && r.observer) {
    if (r.observer->P.size() > 0) d["P"] = matrix(r.observer->P);
    if (r.observer->M.size() > 0) d["P_filtered"] = matrix(r.observer->P_filtered), d["M"] = matrix(r.observer->M);
    d["closed_loop_poles"] = poles(r.observer->poles);
    d["condition"] = number(r.observer->condition), d["residual"] = number(r.observer->residual);
    if (r.controller) d["controller_poles"] = poles(r.controller->poles), d["controller_from"] = r.controller_from;
  } else if (r.controller) {
    d["closed_loop_poles"] = poles(r.controller->poles);
    d["condition"] = number(r.controller->condition), d["residual"] = number(r.controller->residual);
    if (r.observer) {
      d["observer_poles"] = poles(r.observer->poles);
      d["observer_condition"] = number(r.observer->condition), d["observer_residual"] = number(r.observer->residual);
    }
  }
  if (r.observer) d["observer_from"] = r.observer_from;
  if (!r.pi) d["reference_gain"] = r.reference ? matrix(r.reference->N) : Json(nullptr);
  if (r.reference) {
    d["reference_gain_from_dc_gain"] = matrix(r.reference->N_from_dc_gain);
    d["reference_gain_difference"] = number(r.reference->difference);
  }
  if (r.integral)
    d["integral"] = {{"K", matrix(r.integral->K)},
                     {"closed_loop_poles", poles(r.integral->poles)},
                     {"condition", number(r.integral->condition)},
                     {"residual", number(r.integral->residual)}};
  if (r.separation)
    d["separation"] = {{"combined_poles", poles(r.separation->combined)}, {"distance", number(r.separation->distance)}};
  d["frequency_Hz"] = r.at_Hz > 0.0 ? Json(r.at_Hz) : Json(nullptr);
  d["responses"] = Json::array();
  for (const LoopRow& row : r.rows) d["responses"].push_back(response(r, row));
  d["observer_price"] = Json::array();
  for (const FactorRow& row : r.factors) {
    Json rms = Json::array();
    for (const double x : row.rms) rms.push_back(number(x));
    d["observer_price"].push_back(
        {{"factor", row.factor}, {"slowest_s", number(row.slowest_s)}, {"rms", std::move(rms)}});
  }
  d["notes"] = r.notes, d["warnings"] = r.warnings;
  return text_of(d);
}

}  // namespace slipbench
