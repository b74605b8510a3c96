// The command line: which verb, which file, which options. The only door to CLI11.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "sim/scenario/read.hpp"
#include "sim/sweep/sweep.hpp"
#include "tools/slipbench/clock_band.hpp"

namespace slipbench {

struct Request {
  std::string verb, file;
  std::vector<Override> overrides;    // --set
  std::optional<std::uint64_t> seed;  // --seed
  bool json = false, quiet = false, progress = false;
  std::string trace, figure;    // "": none
  std::uint32_t noise_run = 0;  // run: --run R
  std::uint32_t runs = 20;      // compare: --runs N
  bool in_loop = false;
  std::optional<std::string> publish;  // run: --publish ENDPOINT
  unsigned publish_wait = 0;
  double pace = 0.0;                              // run: times real time at most; 0: as fast as it goes
  unsigned threads = 0;                           // 0: all cores
  std::string store, csv, isa, figure_of;         // sweep
  Shard shard;                                    // sweep: --shard i/n
  std::vector<std::string> merge;                 // sweep: --merge STORE, repeatable
  std::string search, write;                      // sweep: --search FIGURE, --write FILE; "": none
  bool on_slurm = false;                          // sweep: --on slurm
  std::uint64_t shards = 0;                       // sweep: --shards N; 0: the usual number
  std::vector<std::string> slurm;                 // sweep: --slurm OPTION, for sbatch, without the dashes
  std::uint32_t budget = 200;                     // sweep: --budget N
  double period_s = 0.0, at_Hz = 0.0;             // analyse, design; 0: not asked
  std::string map, speed_model, estimator, path;  // analyse of a drive; "": not asked
  std::optional<std::uint64_t> plan_case;         // run PLAN --case K
  bool lock_step = false;                         // board: --lock-step
  std::string link, record;                       // board: --link LINK, --record FILE; "": none
  unsigned watchdog = 3, answer_within_ms = 500;
  std::vector<std::string> estimators;  // export: --estimator NAME, repeatable
  bool export_controller = false;       // export: --controller
  bool double_precision = false;        // export: --precision double
  std::string to = "exported";          // export: --to FOLDER
  bool cost = false;                    // export: --cost
  ClockBand band;                       // export: --clock-mhz, --clocks-per-instruction
  bool keys = false, markdown = false;
  std::string schema;  // check: of "scenario", "machine" or "system" files; "": none
  [[nodiscard]] bool wants_reference() const { return keys || !schema.empty(); }  // then there is no file
};

struct CommandLine {
  std::optional<Request> request;
  std::string text;  // help or version, to be printed instead of doing anything
};

// `arguments` without the program's name. Throws InputError with code "usage", place "command line".
CommandLine parse_command_line(const std::vector<std::string>& arguments);

}  // namespace slipbench
