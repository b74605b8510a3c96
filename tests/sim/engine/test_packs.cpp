// Whole drives in packs of lanes: each case gives the very bits that simulate() gives it alone, on each instruction set that
// the processor has, in full and in partly filled packs. A set it lacks is a visible skip (ctest counts it by the text).
#include <bit>
#include <catch2/catch.hpp>
#include <functional>
#include <string>

#include "sim/engine/lanes/ready_cases.hpp"
#include "sim/engine/lanes/run_pack.hpp"
#include "sim/record/digest.hpp"
#include "sim/scenario/read.hpp"
#include "tests/sim/engine/pack_cases.hpp"

using namespace slipbench;
using pack_tests::Family;

namespace {

// All that a run tells, to the bit: the digests, and what they leave out (ticks, covariances, readings, the limit's flag).
struct Fingerprint : RunDigest {
  std::uint64_t rest = 0xcbf29ce484222325u;
  std::int64_t ticks = 0, ended = 0;

  void add(double x) {
    const std::uint64_t bits = x == x ? std::bit_cast<std::uint64_t>(x) : 0x7ff8000000000000u;
    rest = (rest ^ bits) * 0x100000001b3u;
  }
  void control_tick(const TickView& v) override {
    ++ticks;
    add(static_cast<double>(v.tick)), add(v.time_s), add(v.clipped ? 1.0 : 0.0);
    for (double x : *v.plant) add(x);
    for (const auto& e : v.estimates) each_number(e, [&](double x) { add(x); });
  }
  void trace_row(const RowView& v) override {
    RunDigest::trace_row(v);
    add(static_cast<double>(v.row));
    for (double x : v.measured) add(x);
  }
  void end() override { ++ended; }
  [[nodiscard]] std::string text() const {
    std::string all = plant();
    for (std::size_t i = 0; i < estimator_count(); ++i) all += " " + estimator(i);
    return all + " " + std::to_string(rest) + " " + std::to_string(ticks) + " " + std::to_string(ended);
  }
};

std::string outcome_text(const RunOutcome& o) {
  return (o.diverged ? "diverged " + std::to_string(o.diverged_at_s) + " " + o.diverged_what : std::string("done")) +
         " after " + std::to_string(o.simulated_s) + ", clipped " + std::to_string(o.clipped_samples);
}

struct Alone {
  std::string prints, outcome;
};
Alone alone(const Scenario& s, std::uint32_t noise_run) {
  Fingerprint print;
  RunObserver* observer = &print;
  RunOptions options;
  options.noise_run = noise_run;
  const RunOutcome outcome = simulate(s, {&observer, 1}, options);
  return {print.text(), outcome_text(outcome)};
}

// One pack of the family's first `count` cases against each of them alone.
void check_pack(const LaneSet& set, const Family& family, std::size_t count) {
  INFO(family.name << ", " << count << " cases on " << set.name);
  std::vector<Scenario> scenarios;
  std::vector<std::uint32_t> runs;
  std::vector<Fingerprint> prints(count);
  std::vector<std::vector<RunObserver*>> observers;
  for (std::size_t i = 0; i < count; ++i) {
    scenarios.push_back(family.scenario(i));
    runs.push_back(family.noise_run(i));
    observers.push_back({&prints[i]});
    REQUIRE(lanes_can_run(scenarios[i]).empty());
  }
  std::vector<const Scenario*> asked;
  for (const auto& s : scenarios) asked.push_back(&s);
  const std::vector<ReadyCase> ready = ready_cases(set, asked, runs);
  std::vector<const RunSetup*> cases;
  for (const auto& one : ready) {
    REQUIRE(one.refused.empty());
    cases.push_back(&one.setup);
  }
  const std::vector<RunOutcome> outcomes = run_pack(set, cases, observers);
  for (std::size_t i = 0; i < count; ++i) {
    const Alone single = alone(family.scenario(i), family.noise_run(i));
    INFO("case " << i);
    CHECK(prints[i].text() == single.prints);
    CHECK(outcome_text(outcomes[i]) == single.outcome);
    if (i > 0) CHECK(prints[i].text() != prints[0].text());  // the lanes do differ
  }
}

void check_set(std::string_view name) {
  for (const auto& set : lane_sets()) {
    if (set.name != name) continue;
    if (!set.available()) {
      WARN("skipped: this processor has no " << name);
      return;
    }
    for (const Family& family : pack_tests::families()) {
      check_pack(set, family, set.width());
      check_pack(set, family, set.width() > 4 ? set.width() - 3 : 1);
    }
    return;
  }
  FAIL("no set " << name << " in this build");
}

}  // namespace

TEST_CASE("packs sse2: each case has the bits it has alone", "[engine][bits][sse2]") { check_set("sse2"); }
TEST_CASE("packs avx2: each case has the bits it has alone", "[engine][bits][avx2]") { check_set("avx2"); }
TEST_CASE("packs avx512: each case has the bits it has alone", "[engine][bits][avx512]") { check_set("avx512"); }

TEST_CASE("packs: a case that cannot start is refused as simulate() refuses it, the others are ready",
          "[engine][packs]") {
  const Family family = pack_tests::steady_family();
  std::vector<Scenario> scenarios{family.scenario(0), family.scenario(1), family.scenario(2)};
  scenarios[1].reference.speed_rpm.clear();
  scenarios[1].reference.torque_Nm = {{0.0, 1e9}};  // no load takes it
  const Scenario* asked[] = {&scenarios[0], &scenarios[1], &scenarios[2]};
  const std::uint32_t runs[] = {0, 0, 0};
  const auto ready = ready_cases(best_lane_set(), asked, runs);
  CHECK((ready[0].refused.empty() && ready[2].refused.empty()));
  try {
    simulate(scenarios[1], {});
    FAIL("not refused");
  } catch (const InputError& error) {
    CHECK(ready[1].refused == error.message());
  }
}

TEST_CASE("packs: a lane that diverges is told as simulate() tells it, and the others go on", "[engine][packs]") {
  const LaneSet& set = best_lane_set();
  const std::vector<std::string> told{"speed of the plant", "flux of the plant",
                                      "estimate of 'luenberger', which closes"};
  const auto families = pack_tests::failing_families();
  REQUIRE(told.size() == families.size());
  for (std::size_t i = 0; i < told.size(); ++i) {
    check_pack(set, families[i], set.width());
    INFO(families[i].name);  // each meets the failure that it is named after
    CHECK(alone(families[i].scenario(1), 0).outcome.find(told[i]) != std::string::npos);
    CHECK(alone(families[i].scenario(0), 0).outcome.find("done") == 0);
  }
}

TEST_CASE("packs: when every lane is lost the pack ends", "[engine][packs]") {
  struct Count : PackObserver {
    std::int64_t ticks = 0, lost_lanes = 0;
    void control_tick(const PackView&) override { ++ticks; }
    void lost(std::size_t, std::int64_t, Lost) override { ++lost_lanes; }
  } count;
  const Family family = pack_tests::failing_families().front();
  const RunSetup lost = ready_run(family.scenario(1), 0);
  const RunSetup* cases[] = {&lost, &lost};
  const auto outcomes = run_pack(best_lane_set(), Cases(cases).first(lane_sets()[0].width() > 1 ? 2 : 1), count);
  CHECK(outcomes[0].diverged);
  CHECK(count.lost_lanes == static_cast<std::int64_t>(outcomes.size()));
  CHECK(count.ticks < lost.shape.steps / lost.shape.steps_per_control);
}

TEST_CASE("packs: an observer stops the pack, and what it throws comes out", "[engine][packs]") {
  struct Stopper : PackObserver {
    bool throws = false;
    bool keep_going(std::int64_t tick) override {
      if (tick == 7 && throws) throw std::runtime_error("disk full");
      return tick < 7;
    }
  } stopper;
  const RunSetup one = ready_run(pack_tests::families().front().scenario(0), 0);
  const RunSetup* cases[] = {&one};
  const auto outcomes = run_pack(best_lane_set(), cases, stopper);
  CHECK(outcomes[0].stopped);
  CHECK(outcomes[0].simulated_s == static_cast<double>(7 * one.shape.steps_per_control) * one.shape.plant.step_s);
  stopper.throws = true;
  CHECK_THROWS_WITH(run_pack(best_lane_set(), cases, stopper), "disk full");
}

TEST_CASE("packs: with observers of single runs too a pack stops when asked", "[engine][packs]") {
  const RunSetup one = ready_run(pack_tests::families().front().scenario(0), 0);
  const RunSetup* cases[] = {&one};
  const std::vector<std::vector<RunObserver*>> nobody(1);
  int left = 3;
  auto outcomes = run_pack(best_lane_set(), cases, nobody, [&] { return --left > 0; });
  CHECK(outcomes[0].stopped);
  CHECK(outcomes[0].simulated_s > 0.0);
  outcomes = run_pack(best_lane_set(), cases, nobody, [] { return true; });
  CHECK_FALSE(outcomes[0].stopped);
}

TEST_CASE("packs: what does not fit together, or in lanes, is refused", "[engine][packs]") {
  const Family family = pack_tests::families().front();
  Scenario s = family.scenario(0), other = s;
  other.run.duration_s *= 2.0;
  const RunSetup a = ready_run(s), b = ready_run(other);
  const RunSetup* cases[] = {&a, &b};
  PackObserver nobody;
  CHECK_THROWS_AS(run_pack(best_lane_set(), cases, nobody), std::logic_error);
  CHECK_THROWS_AS(run_pack(best_lane_set(), {}, nobody), std::logic_error);
  CHECK(lanes_can_run(s).empty());
  other.events.push_back({0.01, "current_sensor_fault", "no_signal", "a", ""});
  CHECK(lanes_can_run(other) == "timed events");
  Scenario switched = pack_tests::conveyor({});
  switched.supply.model = "switched";
  CHECK(lanes_can_run(switched) == "the switched inverter");
  Scenario foreign = s;
  foreign.estimators[0].kind = "mine";
  CHECK(lanes_can_run(foreign).find(s.estimators[0].name) != std::string::npos);
}
