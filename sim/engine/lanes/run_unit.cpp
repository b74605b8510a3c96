// Whole drives in lanes; compiled once per instruction set, like unit.cpp beside it. Memory is taken while a pack is set up;
// what that may throw ends here.
#include "sim/engine/lanes/run_unit.hpp"

#include "plant/math/lanes.hpp"
#include "sim/engine/clock.hpp"
#include "sim/engine/drive_loop.hpp"
#include "sim/engine/run_in.hpp"

namespace slipbench {
namespace {

using Pack = Lanes<SLIPBENCH_ISA, SLIPBENCH_LANES>;
constexpr std::size_t width = Pack::width;

const double* numbers(const Pack& first) { return reinterpret_cast<const double*>(&first); }

struct Host {
  LanesRun& job;
  DriveLoop<Pack>& loop;
  Pack counts;  // 1: the lane is used and nothing went wrong in it
  PlantRowOf<Pack> row{};
  std::array<Lost, width> lost{};

  Host(LanesRun& run, DriveLoop<Pack>& drive) : job(run), loop(drive) {
    for (std::size_t lane = 0; lane < width; ++lane) counts.set(lane, lane < job.used ? 1.0 : 0.0);
  }

  void act(std::int64_t k) {
    loop.disturb(k);
    loop.sense(k);
    loop.estimate();
    loop.control(k);
  }
  void look(std::int64_t n) { row = loop.row(n); }
  [[nodiscard]] LanesView view(std::int64_t index) const {
    LanesView v;
    v.index = index;
    v.time_s = row[P::time].get(0);
    v.plant = numbers(row[P::time]);
    if (!loop.estimates().empty()) v.estimates = numbers(loop.estimates().front().speed);
    v.estimate_stride = sizeof(Estimate<Pack>) / sizeof(double);
    v.clipped = numbers(loop.clipped());
    return v;
  }
  bool tell_tick(std::int64_t k) {
    const LanesView v = view(k);
    const bool wanted = job.sink->tick(job.sink->self, &v);
    if (!loop.find_lost(counts > Pack(0.0), lost)) return wanted;
    for (std::size_t lane = 0; lane < width; ++lane) {
      if (lost[lane] == Lost::nothing) continue;
      counts.set(lane, 0.0);
      job.clipped_samples[lane] = loop.sensors().clipped().get(lane);
      job.sink->lost(job.sink->self, lane, k, static_cast<std::int32_t>(lost[lane]));
    }
    return wanted && any(counts > Pack(0.0));
  }
  void tell_row(std::int64_t r) {
    if (!job.sink->rows) return;
    LanesView v = view(r);
    v.measured = numbers(loop.sensors().values().front());
    job.sink->row(job.sink->self, &v);
  }
  void step(std::int64_t n) { loop.plant_step(n); }
};

struct WholeDrive {
  DriveLoop<Pack> loop;
  Host host;
  RunClock clock;
  explicit WholeDrive(LanesRun& job) : loop(Cases(job.cases, width)), host(job, loop) {}
};

}  // namespace

void run_in_lanes(LanesRun& job) noexcept {
  try {
    if (job.drive == nullptr) job.drive = new WholeDrive(job);
    WholeDrive& drive = *static_cast<WholeDrive*>(job.drive);
    job.over = drive.clock.go(drive.loop.shape(), drive.host, job.ticks);
    if (!job.over) return;
    job.ended_at_step = drive.clock.step();
    for (std::size_t lane = 0; lane < width; ++lane) {
      if (drive.host.counts.get(lane) != 0.0) job.clipped_samples[lane] = drive.loop.sensors().clipped().get(lane);
    }
  } catch (...) {
    job.failed = true;
  }
}

void drop_lanes(LanesRun& job) noexcept {
  delete static_cast<WholeDrive*>(job.drive);
  job.drive = nullptr;
}

void settle_in_lanes(LanesRun& job) noexcept {
  try {
    const Cases cases(job.cases, width);
    DriveLoop<Pack> loop(cases);
    PlantNumbers<Pack> plant;
    side_by_side<Pack>(
        plant, cases, [](const RunSetup& s) -> const auto& { return s.plant; });
    run_in(loop, plant).store(job.moving);
    for (std::size_t lane = 0; lane < job.used; ++lane) loop.save(*job.settled[lane], lane);
  } catch (...) {
    job.failed = true;
  }
}

}  // namespace slipbench
