// Linear analysis of a scenario or a machine in one include: functions that take plain data and give plain data, for a verb to print.
//
//   operating_point(scenario | machine)                  -> OperatingPoint, its `row` in trace columns (plant_columns() names them)
//   system_at(operating point)                           -> linear::System with names and units
//   speed_map(scenario | machine, options, progress)     -> ObservabilityMap: grid, lost line, blind band, the run's path
//   estimator_map(scenario, index, options, progress)    -> EstimatorMap; (scenario, kind, ...) for a kind that it does not list
//
// tools/slipbench/map_csv.hpp and map_figure.hpp turn the maps into CSV and SVG.
// All throw InputError where the file or an option is at fault, linear::LinearError where the mathematics refuses.
#pragma once

#include "sim/linear/estimator_map.hpp"
#include "sim/linear/observability_map.hpp"
#include "sim/linear/operating_point.hpp"
