// Shades of maps: one hue, ever darker, so that order is seen without colour.
#pragma once

#include <string>

namespace slipbench {

std::string heat(double share);  // 0 light to 1 dark, red, green and blue at equal distances
// A cell without a figure: grey, crossed.
std::string crossed_cell(double x, double y, double width, double height);

}  // namespace slipbench
