// The CSV trace: numbers read back to the bit, the file appears when it is complete, bad paths are found at once.
#include <unistd.h>
#include <catch2/catch.hpp>

#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>
#include <vector>

#include "sim/record/csv_trace.hpp"
#include "sim/scenario/input_error.hpp"

using namespace slipbench;
namespace fs = std::filesystem;

namespace {

struct Folder {
  fs::path path = fs::temp_directory_path() / ("slipbench-test-csv-" + std::to_string(::getpid()));
  Folder() { fs::create_directories(path); }
  ~Folder() { fs::remove_all(path); }
  [[nodiscard]] std::string file(const char* name) const { return (path / name).string(); }
};

std::string content(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  std::stringstream text;
  text << file.rdbuf();
  return text.str();
}

std::vector<std::string> split(const std::string& line) {
  std::vector<std::string> cells(1);
  for (const char c : line) {
    if (c == ',') {
      cells.emplace_back();
    } else {
      cells.back() += c;
    }
  }
  return cells;
}

RunInfo info() {
  RunInfo i;
  i.plant = plant_columns();
  i.measured = {{"measured.i_a_A", "A", ""}};
  i.estimator_names = {"ekf"};
  return i;
}

}  // namespace

TEST_CASE("csv number: the shortest text, and it reads back to the bit", "[record][property]") {
  const auto text_of = [](double number) {
    std::string text;
    append_number(text, number);
    return text;
  };
  CHECK(text_of(0.1) == "0.1");
  CHECK(text_of(2.0) == "2");
  CHECK(text_of(-0.0) == "-0");
  CHECK(text_of(-std::numeric_limits<double>::quiet_NaN()) == "nan");
  std::uint64_t bits =
      88172645463325252u;  // xorshift64 (G. Marsaglia, "Xorshift RNGs", 2003): any spread of bits will do
  for (int i = 0; i < 20000; ++i) {
    bits ^= bits << 13, bits ^= bits >> 7, bits ^= bits << 17;
    const double number = std::bit_cast<double>(bits);
    if (!std::isfinite(number)) continue;
    const std::string text = text_of(number);
    if (std::bit_cast<std::uint64_t>(std::strtod(text.c_str(), nullptr)) != bits) FAIL(text);  // strtod: another reader
  }
}

TEST_CASE("csv trace: header and rows in contract order", "[record][contract]") {
  const Folder folder;
  CsvTrace trace(folder.file("run.csv"));
  trace.begin(info());
  PlantRow plant{};
  for (std::size_t i = 0; i < plant.size(); ++i) plant.at(i) = static_cast<double>(i) + 0.25;
  plant[P::dc_link] = std::numeric_limits<double>::quiet_NaN();
  const std::vector<double> measured = {-7.5}, estimates = {1, 2, 3, 4, 1e-300};
  trace.trace_row({0, &plant, measured, estimates});
  CHECK_FALSE(fs::exists(folder.file("run.csv")));  // not before it is complete
  trace.finish();
  std::istringstream lines(content(folder.file("run.csv")));
  std::string header, row, rest;
  std::getline(lines, header);
  std::getline(lines, row);
  CHECK_FALSE(std::getline(lines, rest));
  CHECK(
      header ==
      "time_s,speed_rpm,speed_reference_rpm,torque_Nm,load_torque_Nm,stator_frequency_Hz,u_alpha_V,u_beta_V,i_alpha_A,"
      "i_beta_A,i_d_A,i_q_A,i_a_A,i_b_A,i_c_A,rotor_flux_Wb,rotor_flux_angle_rad,rotor_flux_reference_Wb,dc_link_V,"
      "stator_resistance_ohm,rotor_resistance_ohm,measured.i_a_A,ekf.speed_rpm,ekf.rotor_flux_Wb,ekf.rotor_flux_angle_"
      "rad,"
      "ekf.torque_Nm,ekf.trust");
  const auto cells = split(row);
  REQUIRE(cells.size() == split(header).size());
  CHECK(cells[0] == "0.25");
  CHECK(cells[18] == "nan");
  CHECK(cells[21] == "-7.5");
  CHECK(cells.back() == "1e-300");
  CHECK(trace.rows() == 1);
  CHECK(trace.columns() == cells.size());
}

TEST_CASE("csv trace: an unfinished one leaves nothing behind, and an older file stays", "[record][edge]") {
  const Folder folder;
  std::ofstream(folder.file("run.csv")) << "old";
  {
    CsvTrace trace(folder.file("run.csv"));
    trace.begin(info());
  }
  CHECK(content(folder.file("run.csv")) == "old");
  CHECK(std::distance(fs::directory_iterator(folder.path), fs::directory_iterator{}) == 1);
}

TEST_CASE("csv trace: a path that cannot be written is found at once", "[record][edge]") {
  const Folder folder;
  CHECK_THROWS_AS(CsvTrace(folder.file("no/such/folder/run.csv")), OutsideError);
  CHECK_THROWS_AS(CsvTrace(folder.path.string()), OutsideError);
  std::ofstream(folder.file("plain")) << "x";
  CHECK_THROWS_AS(CsvTrace(folder.file("plain/run.csv")), OutsideError);
  CHECK_THROWS_AS(CsvTrace(""), OutsideError);
}

TEST_CASE("csv trace: a device that is full is reported when the trace is finished", "[record][edge]") {
  if (!fs::exists("/dev/full")) return;
  CsvTrace trace("/dev/full");
  trace.begin(info());
  PlantRow plant{};
  const std::vector<double> measured = {0.0}, estimates(5, 0.0);
  for (int row = 0; row < 1000; ++row) trace.trace_row({row, &plant, measured, estimates});
  CHECK(trace.failed());
  CHECK_THROWS_AS(trace.finish(), OutsideError);
}
