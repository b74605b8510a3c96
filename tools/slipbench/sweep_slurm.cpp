// sweep --on slurm: the array's job from the command line, and its progress.
#include <fmt/format.h>

#include <filesystem>

#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/progress.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

namespace fs = std::filesystem;

ClusterJob job_of(const Request& request, const SweepPlan& plan, const Store& store) {
  ClusterJob job;
  job.program = fs::read_symlink("/proc/self/exe").string();
  job.sweep = {"sweep", request.file};
  for (const Override& o : request.overrides) job.sweep.insert(job.sweep.end(), {"--set", o.key + "=" + o.value});
  if (request.seed) job.sweep.insert(job.sweep.end(), {"--seed", std::to_string(*request.seed)});
  if (!request.isa.empty()) job.sweep.insert(job.sweep.end(), {"--isa", request.isa});
  job.working_folder = fs::current_path().string();
  job.folder = fs::absolute(store.path()).lexically_normal().string() + ".shards";
  const std::uint64_t units = (plan.cases() + cases_per_unit - 1) / cases_per_unit * plan.runs;
  if (request.shards > units) {
    throw InputError(
        "command line", "--shards",
        fmt::format("--shards {}: a shard is made of units of {} cases and one noise run, and this plan has {}",
                    request.shards, cases_per_unit, units),
        "usage");
  }
  job.shards = request.shards > 0 ? request.shards : usual_shards(plan);
  job.threads = request.threads;
  job.pass = request.slurm;
  return job;
}

}  // namespace

ClusterOutcome sweep_on_slurm(const Request& request, const SweepPlan& plan, Store& store) {
  Progress progress("sweep on slurm", request.progress, request.quiet);
  return run_on_cluster(plan, store, job_of(request, plan, store), [&](const ClusterProgress& p) {
    std::string more = fmt::format("; shards: {} done, {} running, {} waiting", p.finished, p.running, p.waiting);
    if (p.waiting > 0 && p.running == 0) more += " (" + p.why + ")";
    progress.update(p.share, more);
    return !interrupted();
  });
}

}  // namespace slipbench
