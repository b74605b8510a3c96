// The figures of merit by name and unit. A number that does not exist (nothing to judge, never lost, not finite) is
// empty. What each one means stands in estimator_score.hpp and drive_score.hpp.
#pragma once

#include <array>
#include <optional>
#include <string_view>

namespace slipbench {

using Figure = std::optional<double>;

struct EstimatorFigures {
  Figure speed_rmse_rpm, speed_bias_rpm, speed_max_error_rpm, flux_rmse_Wb, angle_rmse_deg, torque_rmse_Nm;
  Figure lost_at_s, settled_at_s;
};

struct DriveFigures {
  Figure speed_tracking_rmse_rpm, load_dip_rpm, recovery_s, peak_current_A, torque_ripple_Nm, copper_loss_W;
  Figure voltage_clipped_fraction;
};

template <class Figures>
struct FigureEntry {
  std::string_view name, unit;
  Figure Figures::*value;
};

inline constexpr std::array<FigureEntry<EstimatorFigures>, 8> estimator_figures = {{
    {"speed_rmse_rpm", "rpm", &EstimatorFigures::speed_rmse_rpm},
    {"speed_bias_rpm", "rpm", &EstimatorFigures::speed_bias_rpm},
    {"speed_max_error_rpm", "rpm", &EstimatorFigures::speed_max_error_rpm},
    {"flux_rmse_Wb", "Wb", &EstimatorFigures::flux_rmse_Wb},
    {"angle_rmse_deg", "deg", &EstimatorFigures::angle_rmse_deg},
    {"torque_rmse_Nm", "N m", &EstimatorFigures::torque_rmse_Nm},
    {"lost_at_s", "s", &EstimatorFigures::lost_at_s},
    {"settled_at_s", "s", &EstimatorFigures::settled_at_s},
}};

inline constexpr std::array<FigureEntry<DriveFigures>, 7> drive_figures = {{
    {"speed_tracking_rmse_rpm", "rpm", &DriveFigures::speed_tracking_rmse_rpm},
    {"load_dip_rpm", "rpm", &DriveFigures::load_dip_rpm},
    {"recovery_s", "s", &DriveFigures::recovery_s},
    {"peak_current_A", "A", &DriveFigures::peak_current_A},
    {"torque_ripple_Nm", "N m", &DriveFigures::torque_ripple_Nm},
    {"copper_loss_W", "W", &DriveFigures::copper_loss_W},
    {"voltage_clipped_fraction", "", &DriveFigures::voltage_clipped_fraction},
}};

}  // namespace slipbench
