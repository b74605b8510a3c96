#include "tools/slipbench/map_csv.hpp"

#include <initializer_list>

#include "sim/record/csv_trace.hpp"

namespace slipbench {

namespace {

void add(std::string& text, std::initializer_list<double> numbers, const char* end = "\n") {
  bool first = true;
  for (const double number : numbers) {
    if (!first) text += ',';
    append_number(text, number);
    first = false;
  }
  text += end;
}

// Calls row(speed index, torque index, point) for each point there is.
template <class Points, class Row>
void each_point(const Plane& plane, const Points& points, Row row) {
  for (std::size_t n = 0; n < points.size(); ++n)
    row(plane.speed_rpm(n / plane.torques), plane.torque_Nm(n % plane.torques), n);
}

}  // namespace

const char* name_of(EstimatorPoint::State state) {
  using State = EstimatorPoint::State;
  return state == State::stable     ? "stable"
         : state == State::marginal ? "marginal"
         : state == State::unstable ? "unstable"
         : state == State::beyond   ? "beyond"
                                    : "unsettled";
}

std::string csv_of(const ObservabilityMap& map) {
  std::string text = "speed_rpm,torque_Nm,stator_frequency_Hz,rotor_flux_Wb,smallest_singular_value\n";
  each_point(map.plane, map.smallest, [&](double speed, double torque, std::size_t n) {
    add(text, {speed, torque, map.stator_frequency_Hz[n], map.rotor_flux_Wb[n], map.smallest[n]});
  });
  return text;
}

std::string csv_of(const ScenarioPath& path) {
  std::string text = "time_s,speed_rpm,torque_Nm,stator_frequency_Hz,rotor_flux_Wb,blind,smallest_singular_value\n";
  for (const PathPoint& p : path.points) {
    add(text, {p.time_s, p.speed_rpm, p.torque_Nm, p.stator_frequency_Hz, p.rotor_flux_Wb, p.blind ? 1.0 : 0.0,
               p.observability});
  }
  return text;
}

std::string csv_of(const EstimatorMap& map) {
  std::string text = "speed_rpm,torque_Nm,state,slowest_per_s,speed_error_rpm\n";
  each_point(map.plane, map.points, [&](double speed, double torque, std::size_t n) {
    add(text, {speed, torque}, ",");
    text += name_of(map.points[n].state);
    add(text += ',', {map.points[n].slowest_per_s, map.points[n].speed_error_rpm});
  });
  return text;
}

}  // namespace slipbench
