// Scores of a pack are those of each case alone, to the bit, whatever differs from lane to lane, in one go or in turns.
#include <catch2/catch.hpp>

#include "sim/engine/lanes/ready_cases.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "sim/score/pack_score.hpp"
#include "tests/sim/engine/pack_cases.hpp"

using namespace slipbench;
using pack_tests::conveyor;

namespace {

struct Figures {
  std::vector<EstimatorFigures> estimators;
  DriveFigures drive;
};

Figures alone(const Scenario& s) {
  const ScoreBasis basis = score_basis(s);
  EstimatorScore estimators(basis);
  DriveScore drive(basis);
  RunObserver* const observers[] = {&estimators, &drive};
  simulate(s, observers);
  return {estimators.figures(), drive.figures()};
}

void check_same(const std::vector<EstimatorFigures>& a, const std::vector<EstimatorFigures>& b) {
  REQUIRE(a.size() == b.size());
  for (std::size_t e = 0; e < a.size(); ++e) {
    for (const auto& entry : estimator_figures) {
      INFO("estimator " << e << ": " << entry.name);
      CHECK(a[e].*entry.value == b[e].*entry.value);
    }
  }
}
void check_same(const DriveFigures& a, const DriveFigures& b) {
  for (const auto& entry : drive_figures) {
    INFO("drive: " << entry.name);
    CHECK(a.*entry.value == b.*entry.value);
  }
}

// Windows, limits, load steps (none, one or three), reference and drift of each lane's own; some estimates are lost by the limits.
Scenario lane(std::size_t i) {
  const double x = static_cast<double>(i);
  const std::string at = pack_tests::number(0.02 + 0.002 * x);
  const std::string one = "[[0.0, 0.0], [" + at + ", 0.0], [" + at + ", 9.0]]";
  const std::string three = "[[0.0, 0.0], [0.0, 2.0], [0.02, 2.0], [0.02, 5.0], [" +
                            pack_tests::number(0.03 + 0.001 * x) + ", 5.0], [" + pack_tests::number(0.03 + 0.001 * x) +
                            ", 1.0]]";
  return conveyor({{"score.from_s", pack_tests::number(0.001 * x)},
                   {"score.to_s", pack_tests::number(0.06 - 0.001 * x)},
                   {"score.lost_error", i % 4 == 1 ? "0.0001" : "0.1"},
                   {"score.lost_for_s", "0.001"},
                   {"score.settled_error", pack_tests::number(0.002 + 0.002 * x)},
                   {"load.1.torque_Nm", i % 3 == 0   ? "[[0.0, 3.0]]"
                                        : i % 3 == 1 ? one
                                                     : three},
                   {"reference.speed_rpm", "[[0.0, 0.0], [0.01, " + pack_tests::number(60.0 + 10.0 * x) + "]]"},
                   {"drift.2.quantity", "magnetizing_inductance"},
                   {"drift.2.factor", "[[0.01, 1.0], [0.05, " + pack_tests::number(0.95 - 0.01 * x) + "]]"}});
}

}  // namespace

TEST_CASE("pack score: the figures of each case alone, to the bit", "[score][bits]") {
  constexpr std::size_t all = 16;
  std::vector<Scenario> scenarios;
  std::vector<Figures> wanted;
  std::size_t lost = 0, recovered = 0;
  for (std::size_t i = 0; i < all; ++i) {
    scenarios.push_back(lane(i));
    wanted.push_back(alone(scenarios.back()));
    for (const auto& e : wanted.back().estimators) lost += e.lost_at_s.has_value();
    recovered += wanted.back().drive.load_dip_rpm.has_value();
  }
  CHECK((lost > 0 && lost < all * wanted[0].estimators.size()));  // else the lanes would not differ
  CHECK((recovered > 0 && recovered < all));
  for (const LaneSet& set : lane_sets()) {
    if (!set.available()) {
      WARN("skipped: this processor has no " << set.name);
      continue;
    }
    for (const std::int64_t ticks : {std::int64_t{1} << 40, std::int64_t{7}}) {
      for (const std::size_t used : {set.width(), set.width() - 1}) {
        std::vector<const Scenario*> pack;
        std::vector<ScoreBasis> bases;
        for (std::size_t i = 0; i < used; ++i) {
          pack.push_back(&scenarios[i]);
          bases.push_back(score_basis(scenarios[i]));
        }
        const std::vector<ReadyCase> ready = ready_cases(set, pack, std::vector<std::uint32_t>(used, 0));
        std::vector<const RunSetup*> cases;
        for (const ReadyCase& one : ready) cases.push_back(&one.setup);
        PackScore score(bases, scenarios[0].estimators.size());
        PackRun run(set, cases, score);
        std::size_t turns = 1;
        while (!run.go_on(ticks)) ++turns;
        // 0.06 s of 100 us: the ticks 0 to 600.
        CHECK(turns == (ticks == 7 ? 86u : 1u));
        for (std::size_t i = 0; i < used; ++i) {
          INFO(set.name << ", lane " << i << " of " << used);
          CHECK(run.outcomes()[i].simulated_s == Approx(0.06));
          check_same(score.estimators(i), wanted[i].estimators);
          check_same(score.drive(i), wanted[i].drive);
        }
      }
    }
  }
}

TEST_CASE("pack run: one that is given up midway frees what it holds", "[score]") {
  const Scenario scenario = lane(1);
  const Scenario* const one = &scenario;
  const std::uint32_t run_number = 0;
  const std::vector<ReadyCase> ready = ready_cases(lane_sets()[0], {&one, 1}, {&run_number, 1});
  const RunSetup* const setup = &ready[0].setup;
  PackScore score({score_basis(scenario)}, scenario.estimators.size());
  PackRun run(lane_sets()[0], {&setup, 1}, score);  // the sanitizers watch
  CHECK_FALSE(run.go_on(10));
}
