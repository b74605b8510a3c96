#include "plant/linear/gain_table.hpp"

#include <stdexcept>

namespace slipbench::linear {
namespace {

constexpr double two_pi = 6.28318530717958647692;
constexpr double rounded_off = 1e-9;  // by a design, of the largest element

std::string shape_text(std::size_t rows, std::size_t columns) {
  return std::to_string(rows) + " x " + std::to_string(columns);
}

void demand_even_at_zero(const char* name, const SettingTable& table) {
  double most = 0.0, across = 0.0;
  for (std::size_t row = 0; row < table.rows; ++row) {
    for (std::size_t column = 0; column < table.columns; ++column) {
      const double size = fabs(table(0, row, column));
      most = max(most, size);
      if ((row + column) % 2 != 0) across = max(across, size);
    }
  }
  if (across > rounded_off * most)
    throw std::invalid_argument(std::string(name) +
                                ": its elements across d and q must be 0 at zero speed, where the two are not coupled; "
                                "they change sign with the speed, and would jump there");
}

const SettingTable& speeds_in(const Settings& given) {
  const SettingTable* speeds = given.table("gain_frequency_Hz");
  if (speeds == nullptr)
    throw std::invalid_argument("gain_frequency_Hz is missing: the speeds that the given gains belong to");
  return *speeds;
}

}  // namespace

void add_matrix(SettingTable& table, const Matrix& m) {
  table.rows = static_cast<std::size_t>(m.rows()), table.columns = static_cast<std::size_t>(m.cols());
  ++table.count;
  for (Eigen::Index row = 0; row < m.rows(); ++row) {
    for (Eigen::Index column = 0; column < m.cols(); ++column) table.numbers.push_back(m(row, column));
  }
}

SettingTable default_gain_speeds(const Nameplate& plate) {
  constexpr double top = 3.0;
  SettingTable speeds{schedule_points, 1, 1, {}};
  for (std::size_t n = 0; n < schedule_points; ++n)
    speeds.numbers.push_back(top * plate.frequency_Hz * static_cast<double>(n) / (schedule_points - 1.0));
  return speeds;
}

void demand_gain_speeds(const Settings& given) {
  const SettingTable& speeds = speeds_in(given);
  bool rises = speeds.count >= 1 && speeds.count <= schedule_points && speeds(0) == 0.0;
  for (std::size_t n = 1; n < speeds.count; ++n) rises = rises && speeds(n) > speeds(n - 1);
  if (!rises)
    throw std::invalid_argument("gain_frequency_Hz: wanted are 1 to " + std::to_string(schedule_points) +
                                " speeds that rise from 0");
}

void demand_gain_period(const Settings& given, double period_s) {
  constexpr double decimal = 1e-9;  // decimal fractions in binary
  if (given.table("K") == nullptr && given.table("L") == nullptr) return;
  if (fabs(given.value("gain_period_s", period_s) - period_s) > decimal * period_s)
    throw std::invalid_argument("gain_period_s: the given gains belong to another control period; design them anew");
}

void demand_gains(const Settings& given, const char* name, std::size_t rows, std::size_t columns,
                  const std::string& why) {
  const std::size_t count = speeds_in(given).count;
  const SettingTable* table = given.table(name);
  if (table == nullptr) throw std::invalid_argument(std::string(name) + " is missing: " + why);
  if (table->count != count)
    throw std::invalid_argument(std::string(name) + " holds " + std::to_string(table->count) +
                                " matrices; wanted is one for each of the " + std::to_string(count) +
                                " speeds of gain_frequency_Hz");
  if (table->rows != rows || table->columns != columns)
    throw std::invalid_argument(std::string(name) + " holds matrices of " + shape_text(table->rows, table->columns) +
                                "; wanted is " + shape_text(rows, columns) + ": " + why);
  demand_even_at_zero(name, *table);
}

void demand_observer_gains(const Settings& given) {
  demand_gains(given, "L", 4, 2, "its rows are the currents and the rotor flux, its columns the currents");
  const SettingTable& L = *given.table("L");
  for (std::size_t n = 0; n < L.count; ++n) {
    for (std::size_t row = 0; row < 4; row += 2) {
      const double a = L(n, row, 0), b = L(n, row + 1, 0);
      if (fabs(L(n, row + 1, 1) - a) + fabs(L(n, row, 1) + b) > rounded_off * (fabs(a) + fabs(b)))
        throw std::invalid_argument(
            "L: each pair of rows must be of the form (a, -b), (b, a): the observer stands in the stationary frame, "
            "and the "
            "machine looks the same from all directions");
    }
  }
}

std::vector<double> gain_speeds_rad_s(const Settings& given) {
  std::vector<double> speeds = speeds_in(given).numbers;
  for (double& x : speeds) x *= two_pi;
  return speeds;
}

Schedule<double, 4> observer_schedule(const Settings& given) {
  const SettingTable& L = *given.table("L");
  std::vector<std::array<double, 4>> points;
  for (std::size_t n = 0; n < L.count; ++n) points.push_back({L(n, 0), L(n, 1), L(n, 2), L(n, 3)});
  return make_schedule(gain_speeds_rad_s(given), points);
}

}  // namespace slipbench::linear
