// A sweep plan: which keys of a scenario vary and how; read from TOML, checked, and turned into cases.
//
// Cases count from 0. Grids cross, the last [[vary]] fastest; [sample] draws over all its keys together (draws.hpp). A case is the
// scenario's file with overrides, so that `run` can repeat one alone, to the bit.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "sim/scenario/read.hpp"
#include "sim/sweep/draws.hpp"

namespace slipbench {

// A value that the scenario is read with before any case is, and where the plan names it, "plan.toml:5:10".
struct Tried {
  std::string value, place;
};

// [[vary]]: keys that move together through values.
struct Vary {
  std::vector<std::string> keys, key_places;
  std::vector<std::string> values;  // as TOML; numbers in the shortest text that reads back the same
  std::vector<Tried> tried;         // each listed value; first, middle and last of a range
};

// [[sample.key]]: keys that share one draw.
struct DrawnKey {
  enum class Distribution { uniform, normal };
  std::vector<std::string> keys, key_places;
  Distribution distribution = Distribution::uniform;
  double low = 0.0, high = 0.0;             // uniform
  double mean = 0.0, sigma = 0.0;           // normal
  std::vector<Tried> tried;                 // the ends; the mean
  [[nodiscard]] double at(double u) const;  // the quantile, 0 < u < 1
};

struct Sampling {
  DrawKind kind = DrawKind::random;
  std::uint64_t count = 0, seed = 1;  // saltelli: base points
  std::vector<DrawnKey> keys;
};

struct SweepPlan {
  std::string path, text, title;
  std::string scenario;             // path, relative to the working folder
  std::uint32_t runs = 1;           // noise runs of each case
  std::vector<Override> of_plan;    // --set plan.KEY, without "plan."
  std::vector<Override> overrides;  // --set for the scenario; none of a key that varies
  std::optional<std::uint64_t> seed;
  std::vector<Vary> varies;
  std::optional<Sampling> sample;

  [[nodiscard]] std::uint64_t cases() const;
  // Every key that varies, in the plan's order; coupled keys one after the other.
  [[nodiscard]] std::vector<std::string> keys() const;
};

// Most cases of one plan: beyond it a count was mistyped.
inline constexpr std::uint64_t most_cases = 1'000'000'000'000;

// `overrides` that begin with "plan." change the plan, the others its scenario. Throws InputError with file:line:column. What can't
// be run is told before any case is; a combination that fails is that case's failure. A plan that varies nothing is one case.
SweepPlan read_plan(const std::string& path, const std::vector<Override>& overrides = {},
                    std::optional<std::uint64_t> seed = {});
// plan_check.cpp, called by it: reads the scenario alone, then with each value that is to be tried.
void check_plan(const SweepPlan& plan);
// The plan's scenario with every machine file that a case of it may name, parsed once.
ScenarioFile scenario_of(const SweepPlan& plan);

// The overrides of a case, one a key in the order of keys(). For a drawn plan rising case numbers cost least.
class CaseMaker {
 public:
  explicit CaseMaker(const SweepPlan& plan);
  [[nodiscard]] std::vector<Override> overrides(std::uint64_t k);  // the plan's --set first

 private:
  const SweepPlan& plan_;
  std::optional<Draws> draws_;
};

}  // namespace slipbench
