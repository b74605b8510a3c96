// Gains scheduled over speed as settings: tables with one matrix a speed, put together, demanded whole, and read.
//
// Speeds stand in gain_frequency_Hz, p n / 60, rising from 0; gains belong to positive ones, so that at 0 nothing may couple d and
// q (it would jump with the speed's sign). Errors: std::invalid_argument with the key and what it must be.
#pragma once

#include <string>

#include "plant/linear/system.hpp"
#include "plant/math/schedule.hpp"
#include "plant/parameters.hpp"
#include "plant/setting.hpp"

namespace slipbench::linear {

void add_matrix(SettingTable& table, const Matrix& matrix);

// 0 to three times rated, in equal steps.
SettingTable default_gain_speeds(const Nameplate& plate);
void demand_gain_speeds(const Settings& given);
// gain_period_s, where given with gains, is this period.
void demand_gain_period(const Settings& given, double period_s);
// The table is there, with `rows` x `columns` at each speed; `why` ends the sentence that says what is wanted.
void demand_gains(const Settings& given, const char* name, std::size_t rows, std::size_t columns,
                  const std::string& why);
// L, 4 x 2, in pairs of rows (a, -b), (b, a).
void demand_observer_gains(const Settings& given);

std::vector<double> gain_speeds_rad_s(const Settings& given);
// Over electrical speed, rad/s: real and imaginary part of the current's gain, then of the flux's.
Schedule<double, 4> observer_schedule(const Settings& given);

}  // namespace slipbench::linear
