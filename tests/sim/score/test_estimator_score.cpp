// Figures of an estimator on synthetic errors whose figures are known in closed form.
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "sim/score/estimator_score.hpp"
#include "tests/sim/score/stream.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

constexpr double pi = 3.14159265358979323846, no_number = std::numeric_limits<double>::quiet_NaN();
// Sums of about 1000 terms of the size of the result: 1000 roundings of 1.1e-16, and the change of unit.
constexpr double rounding = 1e-12;

ScoreBasis basis() {
  ScoreBasis b;
  b.window = {0.0, 1.0};
  b.control_period_s = 1e-3;
  b.rated_speed_rpm = 1500.0;
  b.rated_rotor_flux_Wb = 1.0;
  return b;
}

// Speed error (rpm) as a function of time on a true speed of 900 rpm.
EstimatorFigures with_speed_error(const ScoreBasis& b, const std::function<double(double)>& error) {
  EstimatorScore score(b);
  Stream{}.feed(score, [&](double t, PlantRow& plant, std::vector<Estimate<double>>& e, bool&) {
    plant[P::speed_rpm] = 900.0;
    plant[P::rotor_flux] = 1.0;
    e[0].speed = (900.0 + error(t)) * rad_s_a_rpm;
    e[0].rotor_flux = 1.0;
  });
  return score.figures().at(0);
}

}  // namespace

TEST_CASE("estimator score: a constant and a whole number of sine periods give their closed forms",
          "[score][closed_form]") {
  // e = 3 + 8 sin(2 pi 5 t) over 1000 ticks of whole periods: bias 3, mean square 9 + 32, and tick 1000 lies beyond.
  ScoreBasis b = basis();
  b.window.to_s = 0.999;
  const EstimatorFigures f = with_speed_error(b, [](double t) { return 3.0 + 8.0 * std::sin(2.0 * pi * 5.0 * t); });
  CHECK(*f.speed_bias_rpm == Approx(3.0).epsilon(0).margin(900 * rounding));  // of the 900 rpm taken off
  CHECK(*f.speed_rmse_rpm == Approx(std::sqrt(41.0)).epsilon(0).margin(900 * rounding));
  CHECK(*f.speed_max_error_rpm ==
        Approx(11.0).epsilon(0).margin(900 * rounding));  // the sine's peak is a tick (t = 0.05)
}

TEST_CASE("estimator score: the window's ends are inside", "[score][closed_form]") {
  ScoreBasis b = basis();
  b.window = {0.2, 0.3};
  // 101 ticks from 0.2 to 0.3 inclusive; one of them is off by 101 rpm, so the bias is 1 (0.1 k is no exact double).
  for (const double odd : {0.2, 0.25, 0.3}) {
    const EstimatorFigures f = with_speed_error(b, [&](double t) { return std::fabs(t - odd) < 1e-6 ? 101.0 : 0.0; });
    CHECK(*f.speed_bias_rpm == Approx(1.0).epsilon(0).margin(900 * rounding));
  }
  for (const double odd : {0.199, 0.301}) {
    const EstimatorFigures f = with_speed_error(b, [&](double t) { return std::fabs(t - odd) < 1e-6 ? 101.0 : 0.0; });
    CHECK(std::fabs(*f.speed_bias_rpm) < 900 * rounding);
  }
}

TEST_CASE("estimator score: an angle error wraps, and is left out below a tenth of the rated flux",
          "[score][closed_form]") {
  EstimatorScore score(basis());
  Stream{}.feed(score, [](double t, PlantRow& plant, std::vector<Estimate<double>>& e, bool&) {
    const bool fluxless = t < 0.4995;
    plant[P::rotor_flux] = fluxless ? 0.099 : 1.0;
    e[0].rotor_flux = plant[P::rotor_flux] + 0.25;
    plant[P::rotor_flux_angle] = pi - 0.01;
    e[0].rotor_flux_angle = fluxless ? 0.0 : -pi + 0.02;  // 0.03 rad ahead, across the cut
    plant[P::torque] = 4.0;
    e[0].torque = t < 0.5005 ? 4.0 : 6.0;
  });
  const EstimatorFigures f = score.figures().at(0);
  CHECK(*f.angle_rmse_deg == Approx(0.03 * 180.0 / pi).epsilon(0).margin(180 * rounding));
  CHECK(*f.flux_rmse_Wb == Approx(0.25).epsilon(rounding));
  CHECK(*f.torque_rmse_Nm == Approx(2.0 * std::sqrt(500.0 / 1001.0)).epsilon(rounding));  // ticks 501..1000 of 0..1000
}

TEST_CASE("estimator score: without flux there is no angle error, without ticks no figure", "[score][edge]") {
  EstimatorScore score(basis());
  Stream{}.feed(score, [](double, PlantRow&, std::vector<Estimate<double>>&, bool&) {});
  CHECK_FALSE(score.figures().at(0).angle_rmse_deg);
  CHECK(*score.figures().at(0).speed_rmse_rpm == 0.0);
  ScoreBasis late = basis();
  late.window = {2.0, 3.0};
  const EstimatorFigures none = with_speed_error(late, [](double) { return 1.0; });
  for (const auto& entry : estimator_figures) CHECK_FALSE((none.*entry.value).has_value());
}

TEST_CASE("estimator score: lost from the start of the first stretch that lasts long enough", "[score][closed_form]") {
  // Rated 1500: lost beyond 150 rpm for 50 ms. A stretch of 49 ms does not count, one of 50 ms does.
  const auto stretch = [](double from, double to) {
    return [=](double t) { return t >= from - 1e-6 && t <= to + 1e-6 ? -151.0 : 149.0; };
  };
  CHECK_FALSE(with_speed_error(basis(), stretch(0.3, 0.349)).lost_at_s);
  CHECK(*with_speed_error(basis(), stretch(0.3, 0.350)).lost_at_s == Approx(0.3).epsilon(rounding));
  const EstimatorFigures twice = with_speed_error(basis(), [](double t) {
    return (t > 0.1 && t < 0.12) || t > 0.6 ? 400.0 : 0.0;  // the short one before is no loss
  });
  CHECK(*twice.lost_at_s == Approx(0.601).epsilon(rounding));
  ScoreBasis windowed = basis();
  windowed.window = {0.8, 1.0};  // what lies before the window does not count, nor its part of a stretch
  CHECK_FALSE(with_speed_error(windowed, stretch(0.3, 0.4)).lost_at_s);
  CHECK_FALSE(with_speed_error(windowed, stretch(0.7, 0.849)).lost_at_s);
  CHECK(*with_speed_error(windowed, stretch(0.7, 0.850)).lost_at_s == Approx(0.8).epsilon(rounding));
  windowed.window = {0.1, 0.2};  // but no number is no number
  CHECK(*with_speed_error(windowed, [](double t) { return t > 0.4005 ? no_number : 0.0; }).lost_at_s ==
        Approx(0.401).epsilon(rounding));
}

TEST_CASE("estimator score: settled from the first tick that stays in the band", "[score][closed_form]") {
  // Band 2 % of 1500 = 30 rpm; e = 100 exp(-t / 0.1) stays within from t = 0.1 ln(100 / 30) = 0.12040 s on.
  const EstimatorFigures f = with_speed_error(basis(), [](double t) { return 100.0 * std::exp(-t / 0.1); });
  CHECK(*f.settled_at_s == Approx(0.121).epsilon(rounding));  // the next tick
  CHECK_FALSE(with_speed_error(basis(), [](double t) { return t > 0.9995 ? 31.0 : 0.0; }).settled_at_s);
  ScoreBasis late = basis();
  late.window.from_s = 0.5;
  CHECK(*with_speed_error(late, [](double) { return 0.0; }).settled_at_s == Approx(0.5).epsilon(rounding));
}

TEST_CASE("estimator score: an estimate that is no number is lost at once and has no rms", "[score][edge]") {
  const EstimatorFigures f =
      with_speed_error(basis(), [](double t) { return t > 0.4 && t < 0.4015 ? no_number : 0.0; });
  CHECK(*f.lost_at_s == Approx(0.401).epsilon(rounding));
  CHECK_FALSE(f.speed_rmse_rpm);
  CHECK_FALSE(f.speed_bias_rpm);
  CHECK_FALSE(f.speed_max_error_rpm);
  CHECK(*f.settled_at_s == Approx(0.402).epsilon(rounding));
  CHECK(*f.flux_rmse_Wb == 0.0);  // flux was a number throughout
}
