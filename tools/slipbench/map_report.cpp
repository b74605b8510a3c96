#include "tools/slipbench/map_report.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "sim/scenario/keys.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

std::string plane_text(const Plane& p) {
  return fmt::format("{} to {} rpm in {} points, {} to {} N m in {}", plain(p.speed_from_rpm, 4),
                     plain(p.speed_to_rpm, 4), p.speeds, plain(p.torque_from_Nm, 4), plain(p.torque_to_Nm, 4),
                     p.torques);
}

// Where the line of stator frequency zero runs, by its ends.
std::string line_text(const FrequencyLines& lines) {
  if (lines.lost.empty()) return "";
  const PlanePoint &a = lines.lost.front(), &b = lines.lost.back();
  return fmt::format(
      "Stator frequency is zero on the line from {} rpm at {} N m to {} rpm at {} N m; below {} Hz about it the "
      "drive counts as blind.\n",
      plain(a.speed_rpm, 4), plain(a.torque_Nm, 4), plain(b.speed_rpm, 4), plain(b.torque_Nm, 4),
      plain(lines.blind_below_Hz));
}

std::string path_text(const ScenarioPath& path) {
  if (path.blind_s <= 0.0) return fmt::format("The scenario runs {} s and is never blind.\n", plain(path.duration_s));
  std::string out = fmt::format("The scenario runs {} s, blind for {} s of it, at most {} s on end, from {} s.\n",
                                plain(path.duration_s), significant(path.blind_s, 3),
                                significant(path.longest_blind_s, 3), significant(path.longest_from_s, 4));
  return path.diverged ? out + "It diverges under way.\n" : out;
}

}  // namespace

std::vector<std::string_view> mapped_estimator_kinds() {
  for (const Key& key : scenario_keys()) {
    if (key.path == "estimator[].kind") return {key.words.begin(), key.words.end()};
  }
  return {};
}

std::string map_report(const ObservabilityMap& m) {
  std::string out = fmt::format("{}{}: where speed can be seen, model {}\n", m.title, m.title.empty() ? "map" : "",
                                linear::name_of(m.model));
  out += fmt::format("  {}; {}\n", plane_text(m.plane), m.flux_text);
  if (!m.smallest.empty()) {
    const auto low = std::min_element(m.smallest.begin(), m.smallest.end());
    const auto at = static_cast<std::size_t>(low - m.smallest.begin());
    out += fmt::format("Smallest scaled singular value: {} at rated speed and torque; least {} at {} rpm and {} N m.\n",
                       significant(m.at_rated, 3), plain(*low, 3), plain(m.plane.speed_rpm(at / m.plane.torques), 4),
                       plain(m.plane.torque_Nm(at % m.plane.torques), 4));
  }
  out += m.model == linear::SpeedModel::known_load
             ? "Known load: speed stays observable on that line, but only through the shaft, weakly.\n"
             : "On that line no speed can be told from currents and voltages, whatever the estimator.\n";
  out += line_text(m.lines);
  return m.path ? out + path_text(*m.path) : out;
}

MapCounts counts_of(const EstimatorMap& m) {
  MapCounts counts;
  for (const EstimatorPoint& p : m.points) {
    if (p.state == EstimatorPoint::State::stable) ++counts.stable;
    if (p.state == EstimatorPoint::State::marginal) ++counts.marginal;
    if (p.state == EstimatorPoint::State::unstable) ++counts.unstable;
    if (p.state == EstimatorPoint::State::unsettled) ++counts.unsettled;
  }
  return counts;
}

std::string map_report(const EstimatorMap& m) {
  std::string out =
      fmt::format("{}{}: where {} ({}) is stable\n", m.title, m.title.empty() ? "map" : "", m.name, m.kind);
  out += fmt::format("  {}; {}\n", plane_text(m.plane), m.flux_text);
  const MapCounts counts = counts_of(m);
  out += fmt::format(
      "Of {} points {} are stable, {} marginal (neither grow nor die within 10 s), {} unstable, {} without a steady "
      "estimate.\n",
      m.points.size(), counts.stable, counts.marginal, counts.unstable, counts.unsettled);
  std::size_t slow = m.points.size();
  for (std::size_t i = 0; i < m.points.size(); ++i) {
    if (m.points[i].state != EstimatorPoint::State::stable) continue;
    if (slow == m.points.size() || m.points[i].slowest_per_s > m.points[slow].slowest_per_s) slow = i;
  }
  if (slow < m.points.size())
    out += fmt::format("Slowest where stable: time constant {} s at {} rpm and {} N m.\n",
                       significant(-1.0 / m.points[slow].slowest_per_s, 3),
                       plain(m.plane.speed_rpm(slow / m.plane.torques), 4),
                       plain(m.plane.torque_Nm(slow % m.plane.torques), 4));
  std::size_t outside = 0;
  for (std::size_t i = 0; i < m.points.size(); ++i) {
    if (m.points[i].state != EstimatorPoint::State::unstable) continue;
    const std::size_t k = i % m.plane.torques;
    if (k >= m.lines.blind_from.size() || k >= m.lines.blind_to.size()) continue;
    const double a = m.lines.blind_from[k].speed_rpm, b = m.lines.blind_to[k].speed_rpm,
                 x = m.plane.speed_rpm(i / m.plane.torques);
    outside += x < std::min(a, b) || x > std::max(a, b) ? 1 : 0;
  }
  if (counts.unstable > 0) out += fmt::format("Of the unstable ones {} lie outside the blind band.\n", outside);
  return out + line_text(m.lines);
}

}  // namespace slipbench
