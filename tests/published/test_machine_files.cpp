// The machine files that are shipped, against figures of the published circuits: torque, current and power factor at a slip,
// pull-out, current at no load and at start. The figures were computed twice from the printed circuits by independent means
// (SciPy and 60-digit arithmetic), so that a slip of the pen in a file, or in the way from a circuit's form to ours, shows.
#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>

#include "plant/steady_state.hpp"
#include "sim/scenario/read.hpp"

using namespace slipbench;

namespace {

struct Row {
  const char* file;
  double slip, current, power_factor, torque, idle_current, pull_out_slip, pull_out_torque, generator_torque,
      start_current, start_torque;
};

// Sources of the circuits stand in the files. Krishnan's slip is chosen.
const Row rows[] = {
    {"krause_3hp", 0.05, 8.844811120, 0.814783761, 14.026832328, 4.72401559, 0.5267994194, 61.86961835, -106.53565662,
     65.73870494, 52.97167444},
    {"krause_50hp", 0.05277777778, 62.804314729, 0.904459690, 234.640560612, 19.84572645, 0.3778113471, 780.98423751,
     -1030.46739141, 394.17681095, 538.49851115},
    {"krause_500hp", 0.015, 105.206151887, 0.919966915, 1999.352257267, 24.04466512, 0.0779172975, 5065.04407454,
     -6246.53080576, 547.21466143, 852.69593192},
    {"ghanes_1k5", 0.04666666667, 7.125662834, 0.797267690, 12.355878314, 3.84673331, 0.2352132159, 27.17603369,
     -56.45284129, 30.63216481, 14.14728683},
    {"barut_3kw", 0.04666666667, 5.368648641, 0.781771744, 16.329373958, 3.02035882, 0.2972428042, 45.02222797,
     -81.45061426, 27.23970969, 27.36956892},
    {"hinkkanen_2k2", 0.04666666667, 5.959753287, 0.866829684, 20.296154144, 2.57805547, 0.2369215448, 43.18151789,
     -114.33798987, 27.24706334, 23.38583444},
    {"krishnan_5hp", 0.03, 18.697498471, 0.884603299, 28.855130622, 5.53827844, 0.1279842233, 59.34274648, -85.98502430,
     79.38740357, 16.90441792},
    {"fitzgerald_7k5", 0.02, 18.778193872, 0.845565191, 45.672618802, 9.23347974, 0.1918111719, 174.56430868,
     -373.79944291, 152.64377175, 77.62265956},
    {"sen_30kw", 0.03333333333, 42.823098174, 0.941435947, 163.109987172, 8.70728533, 0.1955431813, 429.36748333,
     -695.31526814, 244.19007397, 183.62436080},
};

const std::filesystem::path machines = std::filesystem::path(SLIPBENCH_SOURCE_DIR) / "configs/machines";

double rms(const Vec2<double>& i) { return std::hypot(i.x, i.y) / std::sqrt(2.0); }

}  // namespace

TEST_CASE("shipped machine files: give the published circuits' figures", "[published][plant]") {
  for (const Row& row : rows) {
    INFO(row.file);
    const MachineSettings machine = read_machine((machines / row.file).replace_extension(".toml").string());
    const Circuit<double> c = machine.circuit();
    const double w = machine.nameplate().angular_frequency(), u = machine.nameplate().phase_peak_V();
    const auto at = [&](double slip) { return steady_at_slip(c, u, w, slip); };
    // Ten to eleven digits are given, slips to ten (0.0466... is 7/150 to within 1e-9 of it); the files' inductances are reactances
    // over 2 pi f to sixteen.
    const auto same = [](double given) { return Approx(given).epsilon(1e-8); };
    const SteadyState load = at(row.slip);
    CHECK(rms(load.current) == same(row.current));
    CHECK(load.torque == same(row.torque));
    const double power_in = 1.5 * (load.voltage.x * load.current.x + load.voltage.y * load.current.y);
    CHECK(power_in / (3.0 * u / std::sqrt(2.0) * rms(load.current)) == same(row.power_factor));
    CHECK(rms(at(0.0).current) == same(row.idle_current));
    CHECK(pull_out_slip(c, w) == same(row.pull_out_slip));
    CHECK(at(row.pull_out_slip).torque == same(row.pull_out_torque));
    CHECK(at(-row.pull_out_slip).torque == same(row.generator_torque));
    CHECK(rms(at(1.0).current) == same(row.start_current));
    CHECK(at(1.0).torque == same(row.start_torque));
  }
}

TEST_CASE("shipped machine files: every one is either checked here or says that it is invented", "[published][plant]") {
  int files = 0;
  for (const auto& entry : std::filesystem::directory_iterator(machines)) {
    const std::string name = entry.path().stem().string();
    ++files;
    INFO(name);
    const bool checked =
        std::any_of(std::begin(rows), std::end(rows), [&](const Row& row) { return row.file == name; });
    CHECK((checked || read_machine(entry.path().string()).source == "invented"));
  }
  CHECK(files >= 10);
}
