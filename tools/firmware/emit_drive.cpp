// emit_drive SCENARIO FOLDER: the firmware's part that depends on the drive: board_drive.h (converters, period, names of the exported
// parts) and board_read.c (codes to currents and believed voltage, recorded from the engine's own templates).
#include <cmath>
#include <cstdio>
#include <exception>
#include <fstream>
#include <string>

#include "plant/inverter_averaged.hpp"
#include "plant/math/symbol.hpp"
#include "sim/scenario/read.hpp"

using namespace slipbench;

namespace {

using R = Symbol<float>;

[[noreturn]] void refuse(const std::string& key, const std::string& why) {
  throw InputError("", key, key + ": " + why, "firmware");
}

std::string number(double x) {
  char text[64];
  std::snprintf(text, sizeof text, "%af", static_cast<double>(static_cast<float>(x)));
  return text;
}

double volts_per_code(const AnalogSensorSettings& s) { return std::ldexp(s.range, 1 - static_cast<int>(s.bits)); }

void check(const Scenario& s) {
  if (s.on_mains()) refuse("supply.kind", "a board needs an inverter");
  if (s.controller.speed_from == "measured")
    refuse("controller.speed_from", "this firmware takes it from an estimator");
  if (!s.controller.flux_from.empty() && s.controller.flux_from != s.controller.speed_from)
    refuse("controller.flux_from", "this firmware has one estimator, that of the speed");
  for (const auto& [sensor, name] :
       {std::pair(&s.sensors.current, "sensors.current"), std::pair(&s.sensors.dc_link, "sensors.dc_link")}) {
    if (sensor->bits < 8 || sensor->bits > 16)
      refuse(std::string(name) + ".bits", "8 to 16 expected, the board's converter");
  }
}

// What the engine's drive loop does between sensors and estimator (sim/engine/drive_tick.hpp), on codes.
std::string read_source(const Scenario& s) {
  Program<float> program;
  Phases<R> code;
  code.a = program.input("code_a"), code.b = program.input("code_b"), code.c = program.input("code_c");
  const R code_dc_link = program.input("code_dc_link");
  Vec2<R> before;
  before.x = program.input("before_i_alpha"), before.y = program.input("before_i_beta");
  const R dc_link_before = program.input("before_dc_link");
  Phases<R> duty;
  duty.a = program.input("duty_a"), duty.b = program.input("duty_b"), duty.c = program.input("duty_c");

  const R lsb(volts_per_code(s.sensors.current)), half(0.5);
  const Phases<R> i{code.a * lsb, code.b * lsb, code.c * lsb};
  const Vec2<R> current = s.sensors.current_phases == 2 ? clarke_two(i.a, i.b) : clarke(i);
  const R dc_link = code_dc_link * R(volts_per_code(s.sensors.dc_link));
  const R mean_dc_link = half * (dc_link_before + dc_link);
  const double dead_time = s.supply.dead_time_s * s.belief.dead_time,
               drop = s.supply.device_drop_V * s.belief.device_drop;
  const LegError<double> leg =
      leg_error(dead_time, s.supply.switching_frequency_Hz, drop, s.supply.zero_current_width_A);
  const LegError<R> believed{R(leg.dead_share), R(leg.device_drop), R(leg.per_width)};
  const bool compensated = s.controller.dead_time_compensation && (dead_time > 0.0 || drop > 0.0);
  const Vec2<R> u = compensated ? averaged_voltage(believed, phases_of(half * (before + current)), duty, mean_dc_link)
                                : applied_voltage(duty, mean_dc_link);
  program.output("i_alpha", current.x);
  program.output("i_beta", current.y);
  program.output("dc_link", dc_link);
  program.output("u_alpha", u.x);
  program.output("u_beta", u.y);
  return program.emit_c("board_read");
}

std::string header(const Scenario& s) {
  const std::string estimator = s.controller.speed_from;
  const auto define = [](const std::string& name, const std::string& value) {
    return "#define " + name + " " + value + "\n";
  };
  std::string t =
      "/* The drive that this firmware was built for: \"" + s.title + "\". Written by emit_drive; do not edit. */\n";
  t +=
      "#ifndef BOARD_DRIVE_H\n#define BOARD_DRIVE_H\n\n#include \"controller.h\"\n#include \"" + estimator + ".h\"\n\n";
  t += define("BOARD_CONTROL_PERIOD_NS", std::to_string(std::llround(s.run.control_period_s * 1e9)) + "u");
  t += define("BOARD_DELAY_PERIODS", std::to_string(s.controller.delay_periods));
  t += define("BOARD_CURRENTS", std::to_string(s.sensors.current_phases));
  t += define("BOARD_CURRENT_BITS", std::to_string(s.sensors.current.bits));
  t += define("BOARD_CURRENT_RANGE_A", number(s.sensors.current.range));
  t += define("BOARD_DC_LINK_BITS", std::to_string(s.sensors.dc_link.bits));
  t += define("BOARD_DC_LINK_RANGE_V", number(s.sensors.dc_link.range));
  t += define("BOARD_DC_LINK_V_PER_CODE", number(volts_per_code(s.sensors.dc_link)));
  t += "/* A real part: the counts of its PWM timer's period. */\n" + define("BOARD_DUTY_COUNTS", "65535u");
  t += define("BOARD_FLUX_FROM_ESTIMATOR", s.controller.flux_from.empty() ? "0" : "1") + "\n";
  for (const char* type : {"state", "sample", "estimate"})
    t += "typedef " + estimator + "_" + type + " board_estimator_" + type + ";\n";
  for (const char* type : {"state", "measurement", "command"})
    t += std::string("typedef controller_") + type + " board_controller_" + type + ";\n";
  for (const char* call : {"init", "step"}) {
    t += define(std::string("board_estimator_") + call, estimator + "_" + call);
    t += define(std::string("board_controller_") + call, std::string("controller_") + call);
  }
  t += "\n/* Codes, readings of the tick before and duties that acted since, to what the estimator sees. */\nenum {\n";
  for (const char* in : {"CODE_A", "CODE_B", "CODE_C", "CODE_DC_LINK", "BEFORE_I_ALPHA", "BEFORE_I_BETA",
                         "BEFORE_DC_LINK", "DUTY_A", "DUTY_B", "DUTY_C"})
    t += std::string("  BOARD_READ_") + in + ",\n";
  t += "  BOARD_READ_INPUTS\n};\nenum {\n";
  for (const char* out : {"I_ALPHA", "I_BETA", "DC_LINK", "U_ALPHA", "U_BETA"})
    t += std::string("  BOARD_READ_") + out + ",\n";
  t += "  BOARD_READ_OUTPUTS\n};\nvoid board_read(const float in[], float out[]);\n\n#endif\n";
  return t;
}

bool write(const std::string& path, const std::string& text) {
  std::ofstream file(path, std::ios::binary);
  file << text;
  return static_cast<bool>(file.flush());
}

}  // namespace

int main(int count, char** words) try {
  if (count != 3) return std::fputs("usage: emit_drive SCENARIO FOLDER\n", stderr), 2;
  const Scenario scenario = read_scenario(words[1], {}, {});
  check(scenario);
  const std::string folder = words[2];
  if (!write(folder + "/board_drive.h", header(scenario)) || !write(folder + "/board_read.c", read_source(scenario)))
    return std::fprintf(stderr, "emit_drive: cannot write into %s\n", words[2]), 3;
  return 0;
} catch (const std::exception& error) {
  return std::fprintf(stderr, "emit_drive: %s\n", error.what()), 2;
}
