#include "sim/score/means.hpp"

#include <algorithm>
#include <limits>

namespace slipbench {

void ColumnMeans::begin(const RunInfo& info) {
  control_period_s_ = info.control_period_s;
  measured_count_ = info.measured.size();
  names_.clear();
  last_.clear();
  for (const Column& column : info.plant) names_.push_back(column.name);
  for (const Column& column : info.measured) names_.push_back(column.name);
  for (const std::string& name : info.estimator_names) {
    for (const Column& column : estimator_columns(name)) names_.push_back(column.name);
  }
  tick_sums_.assign(plant_column_count + estimator_column_count * info.estimator_names.size(), 0.0);
  row_sums_.assign(measured_count_, 0.0);
  ticks_ = rows_ = 0;
}

void ColumnMeans::control_tick(const TickView& view) {
  if (!window_.holds(view.time_s, control_period_s_)) return;
  ticks_ += 1;
  std::size_t at = 0;
  for (const double value : *view.plant) tick_sums_[at++] += value;
  for (const Estimate<double>& e : view.estimates) {
    const double to_rpm = 30.0 / 3.14159265358979323846;
    for (const double value : {e.speed * to_rpm, e.rotor_flux, e.rotor_flux_angle, e.torque, e.trust}) {
      tick_sums_[at++] += value;
    }
  }
}

void ColumnMeans::trace_row(const RowView& view) {
  last_.assign(view.plant->begin(), view.plant->end());
  last_.insert(last_.end(), view.measured.begin(), view.measured.end());
  last_.insert(last_.end(), view.estimates.begin(), view.estimates.end());
  if (!window_.holds((*view.plant)[P::time], control_period_s_)) return;
  rows_ += 1;
  for (std::size_t i = 0; i < std::min(measured_count_, view.measured.size()); ++i) row_sums_[i] += view.measured[i];
}

std::vector<NamedValue> ColumnMeans::means() const {
  const double none = std::numeric_limits<double>::quiet_NaN();
  std::vector<NamedValue> all;
  for (std::size_t i = 0; i < names_.size(); ++i) {
    const bool measured = i >= plant_column_count && i < plant_column_count + measured_count_;
    const double count = measured ? rows_ : ticks_;
    const double sum = measured                 ? row_sums_[i - plant_column_count]
                       : i < plant_column_count ? tick_sums_[i]
                                                : tick_sums_[i - measured_count_];
    all.push_back({names_[i], count > 0 ? sum / count : none});
  }
  return all;
}

std::vector<NamedValue> ColumnMeans::last() const {
  std::vector<NamedValue> all;
  for (std::size_t i = 0; i < std::min(names_.size(), last_.size()); ++i) all.push_back({names_[i], last_[i]});
  return all;
}

}  // namespace slipbench
