// One panel of lines over a common x: frame, grid, round ticks, lines clipped to the frame. For figures of linear systems.
#pragma once

#include <string>
#include <vector>

#include "tools/slipbench/svg.hpp"

namespace slipbench {

struct ChartLine {
  std::vector<double> x, y;  // a point that is not finite parts the line
  std::string_view stroke, dashes;
  double width = 1.6;
  bool stairs = false;  // held from point to point
};

struct ChartMark {  // a thin line across at this x (or y), named
  double at = 0.0;
  bool upright = true;
  std::string name;
};

struct Chart {
  double left = 0.0, top = 0.0, width = 300.0, height = 160.0;  // px of the frame
  std::string heading, x_label;                                 // heading names quantity and unit
  bool decades = false;                                         // x by decades; values above 0
  std::vector<ChartLine> lines;
  std::vector<ChartMark> marks;
  double low = 0.0, high = 0.0;      // of y; equal: what the lines need
  double y_step = 0.0;               // between ticks of y; 0: round ones
  double x_low = 0.0, x_high = 0.0;  // equal: what the lines need
};

// `id` names the clip path, unique within the document.
std::string chart(const Chart& chart, const std::string& id);

struct LegendEntry {
  std::string name;
  std::string_view stroke, dashes;
};
// A row of names from `left` on, wrapped at `right`; `bottom` becomes the last row's base line.
std::string legend(const std::vector<LegendEntry>& entries, double left, double right, double top, double& bottom);

}  // namespace slipbench
