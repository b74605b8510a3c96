// What a sweep's figure shows, as plain data out of its plan and store: a grid of one or two keys, else distributions; and which key
// decides, where keys are drawn.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "sim/sweep/store_sensitivity.hpp"

namespace slipbench {

// A varied key along an axis. Numbers rise; words stand in the plan's order.
struct GridAxis {
  std::string name;  // keys that move together: "a, b"
  std::vector<std::string> labels;
  std::vector<double> numbers;  // none: words
  std::size_t every = 1;        // values shown: one of so many
};

// Over the noise runs of one case.
struct Cell {
  Figure low, median, high;  // 5 %, 50 %, 95 %; none: no run gave the figure
  bool lost = false;         // its estimator was, in a run
};

struct Grid {
  std::vector<GridAxis> axes;            // one or two
  std::vector<std::vector<Cell>> cells;  // of each figure: x * (values of y) + y
};

struct Strip {
  std::vector<double> quantiles;  // 5, 25, 50, 75, 95 % over all rows; none: no row has the figure
  std::uint64_t missing = 0;      // rows without
};

struct SweepPicture {
  std::string title, subtitle;
  std::uint32_t runs = 1;
  std::vector<std::string> figures;  // columns of the store
  std::optional<Grid> grid;
  std::vector<Strip> strips;  // of each figure, where there is no grid
  std::vector<std::string> drawn;
  std::vector<FigureSensitivity> shares;  // of each figure; none where nothing is drawn
};

// Columns that `figure_of` names: itself; FIGURE alone, that of the drive or of all estimators; "": speed_rmse_rpm of all estimators, or the
// drive's tracking error where there are none. InputError that names the nearest.
std::vector<std::string> chosen_figures(const StoreColumns& columns, const std::string& figure_of);

// Figures whose sensitivity is told: speed_rmse_rpm of each estimator, drive.speed_tracking_rmse_rpm, and the chosen ones.
std::vector<std::string> judged_figures(const StoreColumns& columns, const std::vector<std::string>& chosen);

// `shares`: of the judged figures.
SweepPicture picture_of(const SweepPlan& plan, const Store& store, const std::vector<std::string>& figures,
                        const std::vector<FigureSensitivity>& shares);

// "ekf.speed_rmse_rpm": who "ekf", what "speed rmse, rpm".
struct FigureName {
  std::string who, what;
};
FigureName figure_name(const std::string& column);

}  // namespace slipbench
