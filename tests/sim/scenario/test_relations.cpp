// What keys mean together: each rule broken once, refused at its key with its reason, and just kept once.
#include <catch2/catch.hpp>

#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

struct Rule {
  const char *what, *from, *to;  // spoils the text
  const char *key, *says;
};

void broken(const std::string& text, const Rule& rule) {
  INFO(rule.what);
  REQUIRE(error_of(text).code() == "none");
  const std::string spoilt = with(text, rule.from, rule.to);
  const InputError error = error_of(spoilt);
  INFO(error.what());
  CHECK(error.key() == rule.key);
  CHECK(error.message().find(rule.says) != std::string::npos);
  CHECK(error.place().rfind("file.toml:", 0) == 0);
}

std::string measured_text() {
  return with(with(whole_text(), "speed_from = \"fast_1\"", "speed_from = \"measured\""),
              "orientation = \"direct\"\nflux_from = \"ekf\"", "orientation = \"indirect\"");
}

}  // namespace

TEST_CASE("relations: time is counted in whole ticks", "[scenario][relations]") {
  const std::string text = whole_text();
  broken(text, {"control period", "control_period_s = 100e-6", "control_period_s = 105e-6", "run.control_period_s",
                "whole multiple of run.plant_step_s"});
  broken(text, {"control below plant", "control_period_s = 100e-6", "control_period_s = 5e-6", "run.control_period_s",
                "whole multiple"});
  broken(text, {"trace period", "trace_period_s = 1e-3", "trace_period_s = 1.0001e-3", "run.trace_period_s",
                "whole multiple of run.plant_step_s"});
  broken(text, {"duration", "duration_s = 2.0", "duration_s = 2.0005", "run.duration_s",
                "whole multiple of run.trace_period_s"});
  broken(text, {"a billionth is the bound", "duration_s = 2.0", "duration_s = 2.00000002", "run.duration_s",
                "whole multiple"});
  broken(text, {"encoder window", "window_s = 2e-3", "window_s = 2.05e-3", "sensors.speed.window_s",
                "whole multiple of run.control_period_s"});
  broken(text, {"encoder timeout", "timeout_s = 0.2", "timeout_s = 1e-3", "sensors.speed.timeout_s", "shorter"});
  broken(text, {"window after the run", "to_s = 1.5", "to_s = 2.5", "score.to_s", "part of the run"});
  broken(text, {"empty window", "from_s = 0.5", "from_s = 1.5", "score.from_s", "part of the run"});
  // 0.1 and 1e-5 are no binary fractions: what rounding leaves is far inside the relative 1e-9.
  CHECK(read(with(text, "duration_s = 2.0", "duration_s = 2.7")).run.duration_s == 2.7);
  CHECK(read(with(text, "to_s = 1.5", "to_s = 2.0")).score.to_s == 2.0);
}

TEST_CASE("relations: knots", "[scenario][relations]") {
  const std::string text = whole_text();
  const char* good = "[[0.0, 0.0], [0.5, 0.0], [0.5, 8.0]]";
  broken(text, {"back in time", good, "[[0.0, 0.0], [0.5, 0.0], [0.4, 8.0]]", "load.0.torque_Nm.2",
                "times must not go back"});
  broken(text, {"three at once", good, "[[0.5, 0.0], [0.5, 1.0], [0.5, 8.0]]", "load.0.torque_Nm.2",
                "a third knot at 0.5 s"});
  broken(text, {"infinite time", good, "[[0.0, 0.0], [inf, 0.0]]", "load.0.torque_Nm.1.0", "never NaN or infinity"});
  broken(text, {"NaN value", good, "[[0.0, nan]]", "load.0.torque_Nm.0.1", "never NaN or infinity"});
  broken(text, {"no knots", good, "[]", "load.0.torque_Nm", "an array of 0 values"});
  broken(text, {"not in pairs", good, "[[0.0, 1.0, 2.0]]", "load.0.torque_Nm.0", "an array of 3 values"});
  broken(text, {"flat", good, "[0.0, 1.0]", "load.0.torque_Nm.0", "knots"});
  broken(text, {"drift to nothing", "[2.0, 1.5]", "[2.0, 0.0]", "drift.0.factor.2.1", "above 0"});
}

TEST_CASE("relations: who closes the loop", "[scenario][relations]") {
  const std::string text = whole_text(), measured = measured_text();
  broken(text, {"unknown speed source", "speed_from = \"fast_1\"", "speed_from = \"fast1\"", "controller.speed_from",
                "nearest is fast_1"});
  broken(text, {"unknown flux source", "flux_from = \"ekf\"", "flux_from = \"measured\"", "controller.flux_from",
                "one of ekf, fast_1"});
  broken(text,
         {"direct without a source", "flux_from = \"ekf\"\n", "", "controller.flux_from", "direct orientation needs"});
  broken(text, {"source without direct", "orientation = \"direct\"", "orientation = \"indirect\"",
                "controller.flux_from", "indirect orientation"});
  broken(measured,
         {"no sensor", "kind = \"encoder\"\nlines_per_rev = 2048\nclock_Hz = 20e6\nwindow_s = 2e-3\ntimeout_s = 0.2",
          "kind = \"none\"", "controller.speed_from", "there is no speed sensor; the speed loop needs one"});
  const std::string torque =
      with(measured, "speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.7, 1200.0]]", "torque_Nm = [[0, 5]]");
  broken(torque, {"no sensor, torque",
                  "kind = \"encoder\"\nlines_per_rev = 2048\nclock_Hz = 20e6\nwindow_s = 2e-3\ntimeout_s = 0.2",
                  "kind = \"none\"", "controller.speed_from", "indirect orientation needs one"});
  broken(text,
         {"two references", "rotor_flux_Wb = 0.9", "torque_Nm = [[0.0, 1.0]]", "reference.torque_Nm", "one of them"});
  broken(text, {"no reference", "speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.7, 1200.0]]\n", "", "reference.speed_rpm",
                "missing"});
  broken(text, {"no controller",
                text.substr(text.find("[controller]"), text.find("[[estimator]]") - text.find("[controller]")).c_str(),
                "", "controller.kind", "missing table [controller]"});
  broken(text, {"name taken", "name = \"fast_1\"", "name = \"ekf\"", "estimator.1.name", "taken by estimator.0"});
  broken(text,
         {"name with a dot", "name = \"fast_1\"", "name = \"fast.1\"", "estimator.1.name", "letters, digits and _"});
  broken(text, {"no name", "name = \"fast_1\"", "name = \"\"", "estimator.1.name", "letters, digits and _"});
  broken(text,
         {"reserved name", "name = \"fast_1\"", "name = \"measured\"", "estimator.1.name", "stands for the sensors"});
  broken(text, {"estimator kind", "kind = \"luenberger\"", "kind = \"sliding_mode\"", "estimator.1.kind",
                "one of luenberger, reduced_order, extended_kalman"});
  broken(text,
         {"estimator plug-in", "kind = \"luenberger\"", "kind = \"plugin\"", "estimator.1.kind", "one of luenberger"});
  broken(text, {"controller kind", "kind = \"rotor_flux_oriented\"", "kind = \"vector_control\"", "controller.kind",
                "one of rotor_flux_oriented, volts_per_hertz"});
  broken(text, {"setting of another kind", "adaptation_bandwidth_Hz = 80", "load_torque = true",
                "estimator.1.load_torque", "only with extended_kalman"});
  broken(text, {"setting out of range", "adaptation_bandwidth_Hz = 80", "adaptation_bandwidth_Hz = 0",
                "estimator.1.adaptation_bandwidth_Hz", "from 0.1 to"});
  broken(text,
         {"choice between 0 and 1", "load_torque = true", "load_torque = 0.5", "estimator.0.load_torque", "whole"});
}

TEST_CASE("relations: volts per hertz takes neither speed nor flux nor a torque reference", "[scenario][relations]") {
  const std::string loop =
      "kind = \"rotor_flux_oriented\"\norientation = \"direct\"\nflux_from = \"ekf\"\nspeed_from = "
      "\"fast_1\"\n";
  const std::string text = with(with(whole_text(), loop, "kind = \"volts_per_hertz\"\n"), "current_bandwidth_Hz = 300",
                                "slip_compensation = 0.9");
  REQUIRE(error_of(text).code() == "none");
  for (const char* key : {"orientation = \"indirect\"", "flux_from = \"ekf\"", "speed_from = \"measured\"",
                          "current_bandwidth_Hz = 300"}) {
    const std::string given(key);
    const InputError error = error_of(with(text, "slip_compensation", given + "\nslip_compensation"));
    INFO(error.what());
    CHECK(error.key() == "controller." + given.substr(0, given.find(' ')));
    CHECK(error.message().find("only with rotor_flux_oriented") != std::string::npos);
  }
  broken(text, {"share", "slip_compensation = 0.9", "slip_compensation = 1.1", "controller.slip_compensation", "to 1"});
  broken(text, {"torque", "speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.7, 1200.0]]", "torque_Nm = [[0.0, 5.0]]",
                "reference.torque_Nm", "holds a frequency"});
  broken(text, {"event", "[score]", "[[event]]\nat_s = 1\nkind = \"speed_from\"\nestimator = \"ekf\"\n[score]",
                "event.0.kind", "takes a speed from nobody"});
  // It needs no speed sensor.
  CHECK(
      error_of(with(text, "kind = \"encoder\"\nlines_per_rev = 2048\nclock_Hz = 20e6\nwindow_s = 2e-3\ntimeout_s = 0.2",
                    "kind = \"none\""))
          .code() == "none");
}

TEST_CASE("relations: mains and inverter", "[scenario][relations]") {
  const std::string text = whole_text(), mains = mains_text();
  broken(mains, {"controller on mains", "[supply]", "[controller]\nkind = \"rotor_flux_oriented\"\n[supply]",
                 "controller", "no inverter to command"});
  broken(mains, {"reference on mains", "[supply]", "[reference]\nspeed_rpm = [[0, 1]]\n[supply]", "reference",
                 "no controller"});
  broken(mains,
         {"DC link on mains", "[supply]", "[sensors.dc_link]\nnoise_V = 1\n[supply]", "sensors.dc_link", "no DC link"});
  broken(mains,
         {"estimators without voltage", "[supply]", "[[estimator]]\nname = \"a\"\nkind = \"luenberger\"\n[supply]",
          "sensors.voltage", "missing table [sensors.voltage]"});
  broken(mains, {"magnetised on mains", "trace_period_s = 1e-3", "trace_period_s = 1e-3\nstart = \"magnetised\"",
                 "run.start", "mains cannot hold"});
  broken(mains, {"inverter's key", "line_voltage_V = 400.0\nfrequency_Hz",
                 "dc_link_V = 560\nline_voltage_V = 400.0\nfrequency_Hz", "supply.dc_link_V", "only with inverter"});
  broken(text, {"voltage sensors on an inverter", "[sensors.dc_link]",
                "[sensors.voltage]\nnoise_V = 1\n[sensors.dc_link]", "sensors.voltage", "for mains"});
  broken(text,
         {"belief of what is measured", "[belief]", "[belief]\ndc_link = 1.1", "belief.dc_link", "measured DC link"});
  broken(text, {"switched model", "model = \"averaged\"", "model = \"switched\"", "supply.model",
                "not offered yet; \"averaged\" is"});
  broken(text, {"frequency ratio", "switching_frequency_Hz = 10e3", "switching_frequency_Hz = 15e3",
                "supply.switching_frequency_Hz", "1/2 or a whole number"});
  broken(text, {"slow switching", "switching_frequency_Hz = 10e3", "switching_frequency_Hz = 3333.3",
                "supply.switching_frequency_Hz", "1/2 or a whole number"});
  broken(text, {"dead time fills the period", "dead_time_s = 2e-6", "dead_time_s = 50e-6", "supply.dead_time_s",
                "two dead times"});
  broken(text, {"no DC link", "dc_link_V = 560.0", "dc_link_V = 0.0", "supply.dc_link_V", "above 0"});
  broken(text, {"bits without range", "range_A = 30.0\n", "", "sensors.current.range_A", "12 bits needs its range"});
  CHECK(
      read(with(text, "switching_frequency_Hz = 10e3", "switching_frequency_Hz = 5e3")).supply.switching_frequency_Hz ==
      5e3);
  CHECK(read(with(text, "switching_frequency_Hz = 10e3", "switching_frequency_Hz = 30e3"))
            .supply.switching_frequency_Hz == 30e3);
}

TEST_CASE("relations: loads and start", "[scenario][relations]") {
  const std::string imposed = mains_text() + "[[load]]\nkind = \"imposed_speed\"\nspeed_rpm = [[0, 1400]]\n";
  broken(imposed, {"imposed among others", "[[load]]", "[[load]]\nkind = \"constant_torque\"\ntorque_Nm = 1\n[[load]]",
                   "load.1.kind", "shaft equation is off"});
  broken(imposed, {"another initial speed", "trace_period_s = 1e-3", "trace_period_s = 1e-3\ninitial_speed_rpm = 5",
                   "run.initial_speed_rpm", "begins with 1400"});
  broken(whole_text(), {"magnetised with a speed", "start = \"standstill\"", "start = \"magnetised\"",
                        "run.initial_speed_rpm", "does not go with start"});
  broken(whole_text(), {"steady with a speed", "start = \"standstill\"", "start = \"steady\"", "run.initial_speed_rpm",
                        "from the equilibrium"});
  broken(whole_text(),
         {"drift twice", "[score]", "[[drift]]\nquantity = \"rotor_resistance\"\nfactor = [[0, 1]]\n[score]",
          "drift.1.quantity", "already in drift.0"});
  broken(mains_text(),
         {"drift of no DC link", "[supply]", "[[drift]]\nquantity = \"dc_link\"\nfactor = [[0, 1]]\n[supply]",
          "drift.0.quantity", "no DC link"});
  broken(imposed, {"drift of no inertia", "[supply]", "[[drift]]\nquantity = \"inertia\"\nfactor = [[0, 1]]\n[supply]",
                   "drift.0.quantity", "does nothing"});
  CHECK(read(with(whole_text(), "quantity = \"rotor_resistance\"", "quantity = \"dc_link\"")).drifts[0].quantity ==
        "dc_link");
  const std::string inverse = with(mains_text(), "stator_leakage_H = 0.0062\nrotor_leakage_H = 0.0062",
                                   "circuit = \"inverse_gamma\"\ntotal_leakage_H = 0.012");
  broken(inverse, {"drift of nothing", "[supply]",
                   "[[drift]]\nquantity = \"rotor_leakage\"\nfactor = [[0, 1]]\n[supply]", "drift.0.quantity", "is 0"});
}

TEST_CASE("relations: machine", "[scenario][relations]") {
  const std::string text = mains_text();
  broken(text, {"no leakage", "stator_leakage_H = 0.0062\nrotor_leakage_H = 0.0062",
                "stator_leakage_H = 0.0\nrotor_leakage_H = 0.0", "machine.stator_leakage_H", "both 0"});
  broken(text, {"next to none", "stator_leakage_H = 0.0062\nrotor_leakage_H = 0.0062",
                "stator_leakage_H = 1e-9\nrotor_leakage_H = 0.0", "machine.stator_leakage_H", "millionth"});
  broken(text, {"above synchronous speed", "rated_speed_rpm = 1440.0", "rated_speed_rpm = 1500.0",
                "machine.rated_speed_rpm", "below synchronous speed, 1500 rpm"});
  broken(text, {"pole pairs taken for poles", "pole_pairs = 2", "pole_pairs = 4", "machine.rated_speed_rpm",
                "750 rpm with 4 pole pairs"});
  broken(text, {"more power than the line gives", "rated_power_W = 4000.0", "rated_power_W = 40000.0",
                "machine.rated_power_W", "VA"});
  // A wrong unit is found while it makes another machine, not a slightly different one.
  broken(text, {"millihenries", "stator_leakage_H = 0.0062", "stator_leakage_H = 6.2", "machine.stator_leakage_H",
                "more than the magnetizing inductance, 0.172 H"});
  broken(text, {"rotor's millihenries", "rotor_leakage_H = 0.0062", "rotor_leakage_H = 6.2", "machine.rotor_leakage_H",
                "a leakage of 6.2 H"});
  broken(text, {"kilowatts", "rated_power_W = 4000.0", "rated_power_W = 4.0", "machine.rated_power_W", "not kW"});
  broken(text, {"rad/s for the speed", "rated_speed_rpm = 1440.0", "rated_speed_rpm = 150.8", "machine.rated_speed_rpm",
                "less than half of synchronous speed, 1500 rpm"});
  broken(text, {"rad/s for the frequency", "rated_frequency_Hz = 50.0", "rated_frequency_Hz = 314.2",
                "machine.rated_speed_rpm", "9426 rpm with 2 pole pairs"});
  broken(text, {"mN m", "rated_power_W = 4000.0", "rated_torque_Nm = 26500\nrated_power_W = 4000.0",
                "machine.rated_torque_Nm", "26.53 N m"});
  CHECK(read(with(text, "stator_leakage_H = 0.0062", "stator_leakage_H = 0")).machine.stator_leakage_H == 0.0);
}

TEST_CASE("relations: steep laws against the plant step", "[scenario][relations]") {
  const std::string text = whole_text();
  // Electrical: 1/sigma T with R_s + (L_m/L_r)^2 R_r over sigma L_s = 2.7989 ohm / 0.012088 H = 232 1/s, by hand: 4.3 ms.
  const std::string coarse = with(with(mains_text(), "control_period_s = 1e-4", "control_period_s = 1e-2"),
                                  "trace_period_s = 1e-3", "trace_period_s = 1e-2");
  broken(coarse, {"electrical", "plant_step_s = 2e-5", "plant_step_s = 5e-3", "run.plant_step_s", "at most 0.0043"});
  // Friction: 0.5 + 2 N m over 10 us at 0.05 kg m2: 5e-4 rad/s = 0.00477 rpm.
  broken(text, {"friction width", "friction_width_rpm = 2.0", "friction_width_rpm = 0.0047", "shaft.friction_width_rpm",
                "from 0.00477"});
  CHECK(read(with(text, "friction_width_rpm = 2.0", "friction_width_rpm = 0.0048")).shaft.friction_width_rpm == 0.0048);
  broken(text, {"viscous", "viscous_friction_Nms = 0.002", "viscous_friction_Nms = 5001.0",
                "shaft.viscous_friction_Nms", "at most 5000"});
  // Leg error: 560 V 2 us 10 kHz + 1 V = 12.2 V; over 10 us and sigma L_s = 12.09 mH: 10.1 mA.
  broken(text, {"zero-current width", "zero_current_width_A = 0.3", "zero_current_width_A = 0.0100",
                "supply.zero_current_width_A", "from 0.0101"});
  CHECK(read(with(text, "zero_current_width_A = 0.3", "zero_current_width_A = 0.0102")).supply.zero_current_width_A ==
        0.0102);
}
