#include "tools/slipbench/command_table.hpp"

#include <string>

namespace slipbench {

std::span<const VerbRow> verb_rows() {
  static const std::vector<VerbRow> rows = {
      {"run",
       "simulate a scenario once and print the summary",
       "scenario file",
       {"slipbench run configs/scenarios/conveyor_hot_rotor.toml --set belief.rotor_resistance=1.5 --figure run.svg"}},
      {"check",
       "read and validate a scenario, machine or state-space file or a plan, run nothing; or tell what they may hold",
       "any file",
       {"slipbench check configs/scenarios/hoist_lowering.toml --set run.plant_step_s=5e-6",
        "slipbench check --keys | grep rotor_resistance"}},
      {"compare",
       "judge all estimators of a scenario over paired noise runs",
       "scenario file",
       {"slipbench compare configs/scenarios/conveyor_hot_rotor.toml --runs 10 --in-loop --figure compare.svg"}},
      {"sweep",
       "run every case of a plan, in packs and threads, into a store; the same command resumes",
       "sweep plan",
       {"slipbench sweep configs/sweeps/resistance_grid.toml --store grid.sqlite --csv grid.csv --figure grid.svg",
        "slipbench sweep configs/sweeps/worst_resistances.toml --search ekf.speed_rmse_rpm --budget 44 --write "
        "worst.toml"}},
      {"analyse",
       "say what a linear system or drive is: poles, what can be moved and seen, zeros; or map where speed can be seen",
       "state-space, scenario or machine file",
       {"slipbench analyse configs/systems/two_mass_shaft.toml --figure shaft.svg",
        "slipbench analyse configs/scenarios/hoist_lowering.toml --map speed_observability --figure seen.svg",
        "slipbench analyse configs/systems/current_loop_pi.toml --period 1e-4 --at 50"}},
      {"design",
       "compute gains (LQR, poles placed, observers, PI) and compare the loops they make",
       "state-space file, or scenario",
       {"slipbench design configs/systems/two_mass_shaft.toml --figure loops.svg",
        "slipbench design configs/systems/hidden_mode.toml --set design.R=[[0.1]] --json",
        "slipbench design configs/scenarios/conveyor_hot_rotor.toml --write gains.toml"}},
      {"board",
       "close the loop of a simulated drive with a controller board, and score the board's own estimates",
       "scenario file",
       {"slipbench board configs/scenarios/board_conveyor.toml --lock-step --link host --figure board.svg"}},
      {"export",
       "write estimators and the controller of a scenario as C99 for a board, with test vectors",
       "scenario file",
       {"slipbench export configs/scenarios/conveyor_hot_rotor.toml --estimator ekf --to board_code"}},
  };
  return rows;
}

std::span<const OptionRow> option_rows() {
  static constexpr OptionRow rows[] = {
      {"--set", "KEY=VALUE", "run check compare sweep analyse design board export",
       "set a key of the file, dotted; VALUE is TOML or text; repeatable", Takes::key},
      {"--seed", "N", "run check compare sweep analyse design board export",
       "seed of every noise; wins over the file and --set", Takes::number},
      {"--run", "R", "run board", "take noise run R, as `compare` numbers them from 0", Takes::number},
      {"--runs", "N", "compare", "noise runs (20)", Takes::number},
      {"--in-loop", "", "compare", "each estimator closes the speed loop in turn, instead of all riding along"},
      {"--threads", "N", "compare sweep", "threads (all cores); the results do not depend on it", Takes::number},
      {"--case", "K", "run", "of a sweep plan: run case K alone, as the sweep numbers them from 0", Takes::number},
      {"--store", "FILE.sqlite", "sweep",
       "where the rows go (PLAN's name, in this folder); an older one is gone on with", Takes::file},
      {"--csv", "FILE.csv", "sweep analyse", "write the whole store, or the map, as CSV", Takes::file},
      {"--isa", "double|sse2|avx2|avx512", "sweep", "instruction set of the packs (the widest there is); double: none",
       Takes::word},
      {"--shard", "I/N", "sweep", "run part I of N (from 0) into a store of its own"},
      {"--merge", "FILE.sqlite", "sweep", "join this store of a shard into --store and run nothing; repeatable",
       Takes::file},
      {"--search", "FIGURE", "sweep",
       "look for the keys within the plan's ranges that make this figure largest; no store"},
      {"--budget", "N", "sweep", "with --search: runs to spend (200)", Takes::number},
      {"--write", "FILE.toml", "sweep design",
       "the worst case that a search found, as a scenario of its own; or a drive's gains, for [controller] to name",
       Takes::file},
      {"--on", "local|slurm", "sweep", "where it runs: here, or as an array of shards on the Slurm that sbatch reaches",
       Takes::word},
      {"--shards", "N", "sweep", "with --on slurm: tasks of the array (16, or as many as there are units of 64 cases)",
       Takes::number},
      {"--slurm", "OPTION[=VALUE]", "sweep",
       "with --on slurm: an option for sbatch, as in partition=main, account=x, time=2:00:00, nodelist=n1; repeatable"},
      {"--trace", "FILE.csv|FILE.h5", "run board", "write the trace, as CSV or HDF5", Takes::file},
      {"--figure", "FILE.svg", "run compare sweep analyse design board", "draw the result", Takes::file},
      {"--figure-of", "FIGURE", "sweep",
       "what --figure draws, as in ekf.angle_rmse_deg, or angle_rmse_deg for all estimators (speed_rmse_rpm)"},
      {"--publish", "ENDPOINT", "run board",
       "publish the run as it happens: tcp://HOST:PORT, ipc://PATH or PORT (loopback)"},
      {"--publish-wait", "N", "run board", "start when N subscribers are there", Takes::number},
      {"--pace", "FACTOR", "run", "run no faster than FACTOR times real time", Takes::number},
      {"--period", "S", "analyse",
       "of a continuous system: discretise at this period in s, and say what each method costs", Takes::number},
      {"--map", "speed_observability|estimator_stability", "analyse",
       "of a drive, over the torque-speed plane: where speed can be seen, or where an estimator is stable",
       Takes::word},
      {"--model", "constant_speed|unknown_load|known_load", "analyse",
       "with --map speed_observability: what is known of the shaft (constant_speed)", Takes::word},
      {"--estimator", "NAME", "analyse export",
       "stability is mapped of this one of the scenario, or of a built-in kind (the scenario's first, else "
       "luenberger); "
       "export: write this one; repeatable (all estimators and the controller)"},
      {"--path", "FILE.csv", "analyse", "with --map speed_observability: the run's way through the plane as CSV",
       Takes::file},
      {"--at", "HZ", "analyse design", "gain and phase at this frequency (design: the slowest mode's)", Takes::number},
      {"--lock-step", "", "board", "the drive waits for the board at every tick; the one way there is so far"},
      {"--link", "LINK", "board",
       "where the board is: pipe:COMMAND, unix:PATH, serial:DEVICE[@BAUD], replay:FILE.frames, or the firmware of this "
       "build: host (as a process), emulated (Cortex-M4F under QEMU), emulated_uart"},
      {"--record", "FILE.frames", "board",
       "keep the board's answers; --link replay:FILE.frames runs them again without it", Takes::file},
      {"--watchdog", "N", "board", "missing answers in a row that open the gates (3)", Takes::number},
      {"--answer-within", "MS", "board", "an answer that takes longer is missing (500)", Takes::number},
      {"--keys", "", "check", "in place of FILE: every key of a scenario, with range, default and meaning", {}, true},
      {"--markdown", "", "check", "with --keys: as Markdown tables"},
      {"--schema", "[scenario|machine|system]", "check",
       "in place of FILE: JSON Schema of such files, for TOML editors", Takes::word, true},
      {"--controller", "", "export", "the controller"},
      {"--precision", "float|double", "export", "numbers of the C code (float)", Takes::word},
      {"--to", "FOLDER", "export", "where the files go (exported)"},
      {"--cost", "", "export",
       "count each step's instructions on an emulated Cortex-M4F (arm-none-eabi-gcc, qemu-system-arm)"},
      {"--clock-mhz", "N", "export", "with --cost: clock of the board (100)", Takes::number},
      {"--clocks-per-instruction", "LOW..HIGH", "export",
       "with --cost: the band that instructions are turned into time with (1.0..2.5)"},
      {"--json", "", "run check compare sweep analyse design board export",
       "one JSON document on standard output, nothing else"},
      {"--quiet", "", "run check compare sweep analyse design board export", "print nothing but errors"},
      {"--progress", "", "run compare sweep analyse board",
       "show progress on standard error even if it is no terminal"},
  };
  return rows;
}

std::span<const OptionRow> program_rows() {
  static constexpr OptionRow rows[] = {
      {"--help", "", "", "help; after a verb: its options and an example"},
      {"--version", "", "", "print the version"},
      {"--completion", "bash|zsh", "", "print the shell's completion script", Takes::word},
      {"--man", "", "", "print the man page, as roff"},
  };
  return rows;
}

std::span<const StatusRow> status_rows() {
  static constexpr StatusRow rows[] = {
      {0, "done"},
      {1,
       "it ran, but the result is bad: diverged, an estimator lost in `run`, gates opened by the watchdog in `board`, "
       "nothing fit for `export`"},
      {2, "bad usage, or a bad or missing input file"},
      {3, "something outside failed: an output file, standard output, the network, a controller board"},
      {130, "interrupted; what was done is kept"},
  };
  return rows;
}

bool OptionRow::for_verb(std::string_view verb) const {
  return (" " + std::string(verbs) + " ").find(" " + std::string(verb) + " ") != std::string::npos;
}

std::vector<std::string_view> OptionRow::words() const {
  std::vector<std::string_view> words;
  std::string_view rest = value_may_be_left_out() ? value.substr(1, value.size() - 2) : value;
  while (!rest.empty()) {
    words.push_back(rest.substr(0, rest.find('|')));
    rest.remove_prefix(words.back().size() + (rest.size() > words.back().size() ? 1 : 0));
  }
  return words;
}

std::vector<std::string_view> OptionRow::endings() const {
  std::vector<std::string_view> endings = words();
  for (std::string_view& ending : endings) ending.remove_prefix(std::string_view("FILE").size());
  return endings;
}

}  // namespace slipbench
