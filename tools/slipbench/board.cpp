// board: a simulated drive whose controller is a board, in lock-step.
#include <fmt/format.h>
#include <sched.h>

#include <filesystem>

#include "sim/board/hail.hpp"
#include "sim/board/link_open.hpp"
#include "sim/board/recording.hpp"
#include "tools/slipbench/run_session.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

using namespace std::chrono_literals;
namespace fs = std::filesystem;

constexpr auto hello_within = 5s, first_answer_within = 2s;  // an emulator starts; its first byte may take 0.7 s

// Beside the command in the tree it was built in, or where it was installed to.
FirmwareFiles built_firmware() {
  std::error_code none;
  const fs::path here = fs::read_symlink("/proc/self/exe", none).parent_path();
  fs::path folder = here.parent_path() / "firmware";
  if (!fs::exists(folder / "board_host", none)) folder = here.parent_path() / "libexec" / "slipbench";
  return {(folder / "board_host").string(), (folder / "board_semihosting.elf").string(),
          (folder / "board_uart.elf").string()};
}

// In lock-step host and board never run at once: on one core they need not wake each other across two.
class OneCore {
 public:
  explicit OneCore(bool wanted) : held_(wanted && sched_getaffinity(0, sizeof before_, &before_) == 0) {
    const int core = sched_getcpu();
    if (!held_ || core < 0) return;
    cpu_set_t one;
    CPU_ZERO(&one);
    CPU_SET(static_cast<std::size_t>(core), &one);
    sched_setaffinity(0, sizeof one, &one);
  }
  ~OneCore() {
    if (held_) sched_setaffinity(0, sizeof before_, &before_);
  }
  OneCore(const OneCore&) = delete;
  OneCore& operator=(const OneCore&) = delete;

 private:
  cpu_set_t before_{};
  bool held_;
};

constexpr const char* cautions =
    "The drive is simulated; before a real one: power stage disconnected or DC link current-limited,\n"
    "emergency stop, qualified people, local codes. The watchdog is no safety function.\n";

// A board that said hello, or the recording of one.
struct Board {
  std::unique_ptr<Link> link;
  board_hello hello{};
  std::unique_ptr<AnswerSource> answers;

  Board(const Request& request, OutFile* record) {
    if (request.link.starts_with("replay:")) {
      auto recording = std::make_unique<Recording>(request.link.substr(request.link.find(':') + 1));
      hello = recording->hello();
      answers = std::move(recording);
    } else {
      link = open_link(request.link, built_firmware());
      hello = hail(*link, hello_within);
      const auto within = std::chrono::milliseconds(request.answer_within_ms);
      answers =
          std::make_unique<Exchange>(*link, hello, std::max<std::chrono::milliseconds>(first_answer_within, within),
                                     within, [record](const board_answer& a) {
                                       if (record) record->write(recorded(a));
                                     });
    }
    if (record) record->write(recorded(hello));
  }
};

const char* unit_of(const board_hello& hello) {
  return hello.used_unit == BOARD_USED_INSTRUCTIONS  ? "instructions"
         : hello.used_unit == BOARD_USED_NANOSECONDS ? "ns"
                                                     : "";
}

int exit_status(const RunResult& result) {
  const BoardOutcome& board = result.board->outcome;
  if (result.interrupted) return ExitStatus::stopped;
  if (board.gone) return ExitStatus::outside_failed;
  return result.status == "done" ? ExitStatus::done : ExitStatus::bad_result;
}

}  // namespace

int board_verb(const Request& request) {
  want_scenario(request);
  const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
  check_drivable(scenario);
  const double baud = static_cast<double>(baud_of(request.link));
  Scenario told = scenario;
  EstimatorSettings& estimator = told.estimators.emplace_back();
  estimator.name = estimator.kind = outside_name;
  RunSession session(request, origin_of(request.file, request.overrides, request, scenario), told);

  const std::unique_ptr<OutFile> record = request.record.empty() ? nullptr : std::make_unique<OutFile>(request.record);
  const OneCore one_core(started_here(request.link));
  const Board board(request, record.get());
  const std::string name = name_of(board.hello);
  if (!request.quiet) fmt::print(stderr, "board '{}' on {}. {}", name, request.link, cautions);
  const Scenario simulated = fit(scenario, board.hello);
  BoardInLoop in_loop(*board.answers, board.hello, scenario.run.control_period_s, request.watchdog);
  RunOptions options;
  options.outside = &in_loop;
  RunResult result = session.run(simulated, options);
  const BoardOutcome& outcome = in_loop.outcome();
  if (!outcome.lost) board.answers->end();

  if (record) {
    record->finish();
    result.files.push_back(fmt::format("record: {}", request.record));
  }
  result.board = {
      request.link, name, unit_of(board.hello), scenario.run.control_period_s, baud, board.answers->figures(), outcome};
  if (result.status == "done" && (outcome.lost || outcome.faulted)) result.status = "lost";
  tell(request, result);
  const int status = exit_status(result);
  if (outcome.gone)
    fmt::print(stderr, "board '{}' on {}: {}; the gates were opened\n", name, request.link, outcome.why);
  return status;
}

}  // namespace slipbench
