// A scenario's estimators and controller as C99: what is asked for, and the files that come of it. Format version 1.
//
// Each part is a header, a source, test vectors and a program that replays them. The scenario is run once, every step in the
// precision asked for; the vectors are stretches of that run, and the exported step is the one that ran: recorded, not rewritten.
#pragma once

#include <stdexcept>
#include <string>
#include <vector>

#include "plant/math/symbol_text.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

inline constexpr int export_format = 1;

enum class Precision { single, twofold };  // float, double

struct ExportRequest {
  std::string version;                  // of the program, for the record
  std::vector<std::string> estimators;  // names; nothing asked for at all: every part
  bool controller = false;
  Precision precision = Precision::single;
};

struct ExportedFile {
  std::string name, text;
};
struct ExportedPart {
  std::string name, kind;  // "ekf", "extended_kalman"; the controller's name is "controller"
  bool is_controller = false;
  std::size_t state_numbers = 0, state_bytes = 0;
  OperationCount operations;
  std::size_t stretches = 0, ticks = 0;  // of vectors: so many stretches of so many ticks
  std::vector<ExportedFile> files;       // NAME.h, NAME.c, NAME_vectors.h, NAME_replay.c
};

// The scenario's run diverged, or an answer was not a number: not fit for a board.
class UnfitForExport : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

// Throws InputError for a part that the scenario does not have or that is not built in, UnfitForExport as above.
std::vector<ExportedPart> export_parts(const Scenario& scenario, const ExportRequest& request);

}  // namespace slipbench
