// JSON of `analyse --map` and of a drive's design.
#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>

#include "sim/linear/drive_design.hpp"
#include "tools/slipbench/linear_json.hpp"
#include "tools/slipbench/map_csv.hpp"
#include "tools/slipbench/map_report.hpp"

namespace slipbench {

namespace {

using Json = nlohmann::ordered_json;

Json value_of(double x) { return std::isfinite(x) ? Json(x) : Json(nullptr); }

std::string text_of(const Json& document) {
  return document.dump(2, ' ', false, Json::error_handler_t::replace) + "\n";
}

Json plane_json(const Plane& p) {
  return {{"speed_rpm", {p.speed_from_rpm, p.speed_to_rpm}},
          {"speeds", p.speeds},
          {"torque_Nm", {p.torque_from_Nm, p.torque_to_Nm}},
          {"torques", p.torques}};
}

Json line_json(const std::vector<PlanePoint>& line) {
  Json points = Json::array();
  for (const PlanePoint& p : line) points.push_back({value_of(p.speed_rpm), value_of(p.torque_Nm)});
  return points;
}

Json head(const std::string& map, const std::string& title, const Plane& plane, const FrequencyLines& lines) {
  return {{"slipbench", SLIPBENCH_VERSION},
          {"map", map},
          {"title", title},
          {"plane", plane_json(plane)},
          {"blind_below_Hz", lines.blind_below_Hz},
          {"lost_line", line_json(lines.lost)}};
}

Json table_json(const SettingTable& t) {
  Json all = Json::array();
  for (std::size_t n = 0; n < t.count; ++n) {
    Json m = Json::array();
    for (std::size_t i = 0; i < t.rows; ++i) {
      Json row = Json::array();
      for (std::size_t j = 0; j < t.columns; ++j) row.push_back(value_of(t(n, i, j)));
      m.push_back(std::move(row));
    }
    all.push_back(std::move(m));
  }
  return all;
}

}  // namespace

std::string linear_json(const ObservabilityMap& m) {
  Json d = head("speed_observability", m.title, m.plane, m.lines);
  d["model"] = linear::name_of(m.model);
  d["smallest_singular_value"] = Json::array();  // speed the slower, as in the CSV
  for (const double x : m.smallest) d["smallest_singular_value"].push_back(value_of(x));
  d["at_rated"] = value_of(m.at_rated);
  d["path"] = nullptr;
  if (m.path)
    d["path"] = {{"duration_s", m.path->duration_s},
                 {"blind_s", m.path->blind_s},
                 {"longest_blind_s", m.path->longest_blind_s},
                 {"longest_from_s", value_of(m.path->longest_from_s)},
                 {"diverged", m.path->diverged}};
  return text_of(d);
}

std::string linear_json(const EstimatorMap& m) {
  Json d = head("estimator_stability", m.title, m.plane, m.lines);
  d["estimator"] = m.name, d["kind"] = m.kind;
  const MapCounts counts = counts_of(m);
  d["stable"] = counts.stable, d["marginal"] = counts.marginal, d["unstable"] = counts.unstable,
  d["unsettled"] = counts.unsettled;
  d["points"] = Json::array();
  for (const EstimatorPoint& p : m.points)
    d["points"].push_back({{"state", name_of(p.state)}, {"slowest_per_s", value_of(p.slowest_per_s)}});
  return text_of(d);
}

std::string linear_json(const DriveDesign& design, const std::string& title) {
  Json d = {{"slipbench", SLIPBENCH_VERSION}, {"title", title}, {"kind", "state_feedback"}};
  for (const char* name : {"gain_frequency_Hz", "K", "K_integral", "reference_gain", "L"}) {
    const SettingTable* table = design.controller.table(name);
    if (table != nullptr) d[name] = table_json(*table);
  }
  d["gain_period_s"] = value_of(design.controller.value("gain_period_s", std::nan("")));
  d["points"] = Json::array();
  double residual = 0.0, condition = 0.0;
  for (const DriveDesignPoint& p : design.points) {
    Json poles = Json::array();
    for (const linear::Complex& z : p.poles) poles.push_back({value_of(z.real()), value_of(z.imag())});
    Json one = {{"frequency_Hz", p.frequency_Hz},
                {"closed_loop_poles", std::move(poles)},
                {"residual", value_of(p.residual)},
                {"condition", value_of(p.condition)}};
    if (!p.warning.empty()) one["warning"] = p.warning;
    d["points"].push_back(std::move(one));
    residual = std::max(residual, p.residual), condition = std::max(condition, p.condition);
  }
  d["residual"] = value_of(residual), d["condition"] = value_of(condition);
  return text_of(d);
}

}  // namespace slipbench
