#include "tools/slipbench/board_cost.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <cstdio>
#include <filesystem>
#include <fstream>

#include "sim/scenario/input_error.hpp"
#include "tools/slipbench/firmware_files.hpp"
#include "tools/slipbench/program.hpp"

namespace slipbench {

namespace fs = std::filesystem;

namespace {

constexpr const char *compiler = "arm-none-eabi-gcc", *sizer = "arm-none-eabi-size", *emulator = "qemu-system-arm";
constexpr double compile_seconds = 120.0, emulate_seconds = 120.0;  // a thousand steps take a second

// A folder that goes with its owner.
class Scratch {
 public:
  Scratch() {
    std::string name = (fs::temp_directory_path() / "slipbench-cost-XXXXXX").string();
    if (::mkdtemp(name.data()) == nullptr)
      throw OutsideError("cannot make a folder in " + fs::temp_directory_path().string());
    path_ = name;
  }
  ~Scratch() {
    std::error_code ignored;
    fs::remove_all(path_, ignored);
  }
  Scratch(const Scratch&) = delete;
  Scratch& operator=(const Scratch&) = delete;
  [[nodiscard]] std::string file(const std::string& name) const { return (path_ / name).string(); }
  void write(const std::string& name, std::string_view text) const {
    std::ofstream out(path_ / name, std::ios::binary);
    out << text;
    out.close();
    if (!out) throw OutsideError("cannot write " + file(name));
  }

 private:
  fs::path path_;
};

std::string must(const std::vector<std::string>& arguments, double seconds, const std::string& doing) {
  const ProgramAnswer answer = run_program(arguments, seconds);
  if (answer.timed_out) throw OutsideError(fmt::format("{}: {} did not end within {} s", doing, arguments[0], seconds));
  if (answer.status != 0)
    throw OutsideError(
        fmt::format("{}: {} ended with status {}\n{}", doing, arguments[0], answer.status, answer.output));
  return answer.output;
}

// "least N most N sum N ticks N"; 0 where it is not that.
std::uint64_t ticks_of(const std::string& line, BoardCost& cost) {
  unsigned long least = 0, most = 0, sum = 0, ticks = 0;
  if (std::sscanf(line.c_str(), "least %lu most %lu sum %lu ticks %lu", &least, &most, &sum, &ticks) != 4) return 0;
  cost.least = least, cost.most = most, cost.ticks = ticks;
  if (ticks > 0) cost.mean = static_cast<double>(sum) / static_cast<double>(ticks);
  return ticks;
}

}  // namespace

void demand_board_tools() {
  std::string missing;
  for (const char* tool : {compiler, sizer, emulator}) {
    if (!on_path(tool)) missing += (missing.empty() ? "" : ", ") + std::string(tool);
  }
  if (missing.empty() &&
      run_program({compiler, "-print-file-name=libc.a"}, compile_seconds).output.find('/') == std::string::npos)
    missing = "newlib (libc.a for the board)";
  if (missing.empty()) return;
  throw OutsideError(
      fmt::format("--cost compiles for a Cortex-M4F and counts on an emulated one; missing here: {}. On Debian: "
                  "apt-get install --no-install-recommends gcc-arm-none-eabi libnewlib-arm-none-eabi qemu-system-arm",
                  missing));
}

BoardCost cost_on_board(const ExportedPart& part) {
  const Scratch folder;
  for (const EmbeddedFile& file : firmware_files()) folder.write(std::string(file.name), file.text);
  for (const ExportedFile& file : part.files) folder.write(file.name, file.text);
  const std::string doing = "cost of '" + part.name + "'";
  const std::vector<std::string> flags = {
      compiler, "-mcpu=cortex-m4",   "-mthumb",         "-mfloat-abi=hard",  "-mfpu=fpv4-sp-d16", "-std=c99",
      "-O2",    "-ffp-contract=off", "-fno-math-errno", "-Wdouble-promotion"};
  const auto with = [&](std::vector<std::string> more) {
    std::vector<std::string> all = flags;
    all.insert(all.end(), more.begin(), more.end());
    return all;
  };
  const std::string object = folder.file("step.o"), image = folder.file("image.elf");
  must(with({"-c", folder.file(part.name + ".c"), "-o", object}), compile_seconds, doing);
  must(with({"-DVECTORS=\"" + part.name + "_vectors.h\"", "-I" + folder.file(""), folder.file("count.c"),
             folder.file("start.c"), folder.file("semihosting.c"), object, "-nostartfiles", "-T",
             folder.file("mps2_an386.ld"), "-o", image}),
       compile_seconds, doing);

  BoardCost cost;
  cost.name = part.name;
  const std::string sizes = must({sizer, object}, compile_seconds, doing);
  unsigned long text = 0, data = 0;
  if (const std::size_t line = sizes.find('\n');
      line != std::string::npos && std::sscanf(sizes.c_str() + line, "%lu %lu", &text, &data) == 2)
    cost.flash_bytes = text + data;
  const std::string counted =
      must({emulator, "-M", "mps2-an386", "-nodefaults", "-nic", "none", "-display", "none", "-kernel", image,
            "-icount", "shift=7,sleep=off", "-semihosting-config", "enable=on,target=native"},
           emulate_seconds, doing);
  const std::size_t at = counted.find("least ");
  if (at == std::string::npos || ticks_of(counted.substr(at), cost) == 0)
    throw OutsideError(doing + ": the emulated board did not say what it counted:\n" + counted);
  return cost;
}

}  // namespace slipbench
