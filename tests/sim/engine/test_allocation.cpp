// The control tick of a run allocates nothing: every operator new of this program is counted between two ticks.
// The sanitizers bring an operator new of their own, so this stands aside for them.
#if !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)
#include <atomic>
#include <catch2/catch.hpp>
#include <cstdlib>
#include <new>

#include "sim/engine/lanes/run_pack.hpp"
#include "sim/engine/simulate.hpp"
#include "tests/published/sensorless_drive.hpp"

namespace {
std::atomic<std::int64_t> allocations{0};
}

[[gnu::noinline]] void* operator new(std::size_t size) {
  ++allocations;
  if (void* p = std::malloc(size == 0 ? 1 : size)) return p;
  throw std::bad_alloc();
}
[[gnu::noinline]] void operator delete(void* p) noexcept { std::free(p); }
[[gnu::noinline]] void operator delete(void* p, std::size_t) noexcept { std::free(p); }

using namespace slipbench;
using namespace slipbench::published;

namespace {

struct Counter : RunObserver {
  std::int64_t at_first = 0, at_last = 0;
  void control_tick(const TickView& v) override {
    at_last = allocations.load();
    if (v.tick == 1) at_first = at_last;
  }
};

}  // namespace

// Everything at once: three estimators, noise, converters, filters, an encoder, drift, a profile, process noise, tracing.
Scenario busy_drive() {
  Scenario s = inverter_drive(krause_3hp(), 0.6, 8.0, "measured");
  s.run.duration_s = 0.2;
  s.sensors.speed.kind = "encoder";
  s.sensors.current.bandwidth_Hz = 5e3;
  s.sensors.current.bits = 12;
  s.sensors.current.range = 50.0;
  s.process_noise = {0.5, 0.01, 1e-4};
  s.drifts.push_back({"rotor_resistance", {{0.0, 1.0}, {0.1, 1.2}}});
  return s;
}

TEST_CASE("control tick: allocates nothing", "[engine]") {
  Scenario s = busy_drive();
  s.events = {{0.05, "current_sensor_fault", "no_signal", "a", ""},
              {0.06, "current_sensor_fault", "repaired", "a", ""},
              {0.1, "speed_sensor_fault", "stuck", "", ""},
              {0.12, "speed_from", "", "", "extended_kalman"}};
  Counter counter;
  RunObserver* observer = &counter;
  const RunOutcome outcome = simulate(s, {&observer, 1});
  CHECK(outcome.events.size() == 4);
  CHECK(counter.at_first > 0);  // set-up does allocate, and is seen to
  CHECK(counter.at_last == counter.at_first);
}

TEST_CASE("control tick of a pack: allocates nothing", "[engine]") {
  for (const LaneSet& set : lane_sets()) {
    if (!set.available()) continue;  // the packs' own tests count a set that is missing
    std::vector<RunSetup> setups;
    std::vector<const RunSetup*> cases;
    for (std::uint32_t i = 0; i < set.width(); ++i) {
      Scenario s = busy_drive();
      s.drifts[0].factor[1][0] += 0.01 * i;  // knots and noise of their own
      s.loads[0].torque_profile = {{0.0, 0.0}, {0.05 + 0.01 * i, 0.0}, {0.05 + 0.01 * i, 8.0}};
      setups.push_back(ready_run(s, i));
    }
    for (const auto& setup : setups) cases.push_back(&setup);
    std::vector<Counter> counters(cases.size());
    std::vector<std::vector<RunObserver*>> observers;
    for (auto& counter : counters) observers.push_back({&counter});
    run_pack(set, cases, observers);
    INFO(set.name);
    CHECK(counters[0].at_first > 0);
    CHECK(counters[0].at_last == counters[0].at_first);
  }
}

#endif
