// Figure of a sweep: a map of two keys, lines over one, else a strip of quantiles for each estimator and what each drawn key decides.
#pragma once

#include <string>

#include "tools/slipbench/sweep_picture.hpp"

namespace slipbench {

std::string sweep_figure(const SweepPicture& picture);

// The parts, each with the figure's head above it.
std::string sweep_map(const SweepPicture& picture);     // sweep_map.cpp
std::string sweep_lines(const SweepPicture& picture);   // sweep_lines.cpp
std::string sweep_strips(const SweepPicture& picture);  // sweep_strips.cpp

// Title and what was run, down to 60 px.
std::string sweep_head(const SweepPicture& picture, double width);

// Bars of shares of variance, a row a key, from `top` on; moves it to their end.
std::string sweep_shares(const SweepPicture& picture, double left, double right, double& top);  // sweep_shares.cpp

}  // namespace slipbench
