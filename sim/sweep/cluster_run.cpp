#include "sim/sweep/cluster_run.hpp"

#include <algorithm>
#include <chrono>
#include <filesystem>
#include <fstream>
#include <map>
#include <sstream>
#include <thread>

#include "sim/record/out_file.hpp"
#include "sim/sweep/command_run.hpp"
#include "sim/sweep/sweep.hpp"

namespace slipbench {

namespace {

namespace fs = std::filesystem;
using Clock = std::chrono::steady_clock;

constexpr auto between_looks = std::chrono::seconds(1);
constexpr unsigned looks_until_lost = 5;            // a finished store may be seen late over a network
constexpr auto patience = std::chrono::minutes(5);  // with a queue that does not answer
constexpr auto cancel_patience = std::chrono::seconds(60);
constexpr std::size_t log_end = 2000;  // bytes

std::string end_of(const std::string& path, std::size_t bytes) {
  std::ifstream file(path, std::ios::binary | std::ios::ate);
  const auto size = file ? static_cast<std::size_t>(file.tellg()) : 0;
  std::string text(std::min(size, bytes), ' ');
  file.seekg(static_cast<std::streamoff>(size - text.size()));
  file.read(text.data(), static_cast<std::streamsize>(text.size()));
  return text;
}

class Cluster {
 public:
  Cluster(const SweepPlan& plan, Store& store, const ClusterJob& job) : plan_(plan), store_(store), job_(job) {
    open_folder();
  }

  ClusterOutcome run(const std::function<bool(const ClusterProgress&)>& keep_going) {
    const auto begun = Clock::now();
    bool going = true;
    while (going && !wanted_.empty()) {
      look();
      if (wanted_.empty()) break;
      submit_lost();
      const auto next = Clock::now() + between_looks;
      const ClusterProgress p = progress();
      while ((going = keep_going(p)) && Clock::now() < next)
        std::this_thread::sleep_for(std::chrono::milliseconds(100));
    }
    if (going) {
      join();
    } else {
      cancel();
      outcome_.stopped = true;
    }
    sweep_up(going);
    outcome_.wall_s = std::chrono::duration<double>(Clock::now() - begun).count();
    return outcome_;
  }

  // Leaves no job behind; what was finished stays. With a queue that does not answer nothing can be done: the array is left to itself.
  void give_up() noexcept {
    if (deaf_) return;
    try {
      cancel();
      sweep_up(false);
    } catch (...) {
    }
  }

 private:
  [[nodiscard]] std::string file(std::uint64_t shard, const std::string& ending) const {
    return shard_file(job_, shard, ending);
  }
  [[nodiscard]] std::string jobs_file() const { return job_.folder + "/jobs"; }
  [[nodiscard]] std::string script_file() const { return job_.folder + "/task.sh"; }

  void open_folder() {
    std::error_code error;
    fs::create_directories(job_.folder, error);
    if (error) throw OutsideError("cannot make the folder '" + job_.folder + "': " + error.message());
    const std::string ours = "-of-" + std::to_string(job_.shards) + ".";
    for (const auto& entry : fs::directory_iterator(job_.folder)) {
      const std::string name = entry.path().filename().string();
      const bool of_shard = name.find("-of-") != std::string::npos;
      if (of_shard && name.find(ours) == std::string::npos) {
        throw InputError("command line", "--shards",
                         "'" + job_.folder + "' holds shards of an earlier call with another --shards (" + name +
                             "): go on with that number, or remove the folder",
                         "usage");
      }
      if (name.ends_with(".failed") || name.ends_with(".attempts")) fs::remove(entry.path());
    }
    std::ifstream before(jobs_file());
    for (std::string id; std::getline(before, id);) jobs_.push_back(id);
    for (std::uint64_t i = 0; i < job_.shards; ++i) {
      if (fs::exists(file(i, ".sqlite")) || missing_rows(plan_, store_, {i, job_.shards}) > 0) all_.push_back(i);
    }
    wanted_ = all_;
    outcome_.shards = all_.size();
    OutFile script(script_file());
    script.write(task_script(job_));
    script.finish();
  }

  // Which shards are finished, which are in the queue.
  void look() {
    const auto finished = [&](std::uint64_t i) { return fs::exists(file(i, ".sqlite")); };
    std::erase_if(wanted_, finished);
    queue_.clear();
    for (const QueuedTask& task : queued()) {
      if (task.given_up())
        (void)run_command({"scancel", task.job + "_" + std::to_string(task.shard)});
      else
        queue_[task.shard] = task;
    }
    std::erase_if(wanted_, finished);  // what left the queue meanwhile
  }

  std::vector<QueuedTask> queued() {
    if (jobs_.empty()) return {};
    for (const auto until = Clock::now() + patience;;) {
      const CommandOutcome answer = run_command(queue_command(jobs_));
      const bool forgotten = answer.err.find("Invalid job id") != std::string::npos;
      if (answer.status == 0 || forgotten) {
        std::vector<QueuedTask> tasks = parse_queue(answer.out);
        const std::string name = job_name(job_);  // numbers are used again
        std::erase_if(tasks, [&](const QueuedTask& task) { return task.name != name; });
        return tasks;
      }
      deaf_ = Clock::now() > until;
      if (deaf_)
        throw OutsideError("squeue does not answer (" + answer.err + "); the same command takes the array up again");
      std::this_thread::sleep_for(between_looks);
    }
  }

  void submit_lost() {
    std::vector<std::uint64_t> shards;
    for (const std::uint64_t i : wanted_) {
      if (queue_.contains(i)) {
        absent_[i] = 0;
        if (starts_[i] == 0) starts_[i] = 1;  // of an earlier call
        continue;
      }
      if (fs::exists(file(i, ".failed"))) fail(i, "failed");
      if (starts_[i] > 0 && ++absent_[i] < looks_until_lost) continue;
      if (starts_[i] == most_starts) fail(i, "was lost " + std::to_string(most_starts) + " times");
      outcome_.lost += starts_[i]++ > 0;
      absent_[i] = 0;
      shards.push_back(i);
    }
    if (shards.empty()) return;
    const CommandOutcome answer = run_command(submit_command(job_, script_file(), shards));
    if (answer.status != 0) {
      const bool array = answer.err.find("Invalid job array") != std::string::npos;
      throw OutsideError("sbatch refused the array: " + answer.err +
                         (array ? "take fewer --shards than MaxArraySize of this cluster (scontrol show config)" : ""));
    }
    // "JOB" or "JOB;CLUSTER"
    jobs_.push_back(answer.out.substr(0, answer.out.find_first_of(";\n")));
    std::ofstream(jobs_file(), std::ios::app) << jobs_.back() << "\n";
    outcome_.submitted += shards.size();
  }

  [[noreturn]] void fail(std::uint64_t i, const std::string& what) {
    const std::string log = file(i, ".log"), text = end_of(log, log_end);
    throw OutsideError("shard " + shard_name(job_, i) + " " + what + "; its log ends with\n" +
                       (text.empty() ? "(nothing)\n" : text) +
                       "What is finished is kept; the same command goes on once the cause is gone");
  }

  [[nodiscard]] ClusterProgress progress() const {
    ClusterProgress p;
    p.finished = all_.size() - wanted_.size();
    double done = static_cast<double>(p.finished);
    for (const std::uint64_t i : wanted_) {
      const auto at = queue_.find(i);
      if (at == queue_.end()) continue;
      ++(at->second.runs() ? p.running : p.waiting);
      if (!at->second.runs()) p.why = at->second.reason;
      if (at->second.runs()) done += share_in_log(end_of(file(i, ".log"), 200));
    }
    p.share = all_.empty() ? 1.0 : done / static_cast<double>(all_.size());
    return p;
  }

  void join() {
    std::vector<std::string> parts;
    for (const std::uint64_t i : all_) parts.push_back(file(i, ".sqlite"));
    outcome_.merged = merge_stores(plan_, store_, parts);
  }

  // By their name as well as their number.
  void cancel() {
    for (const auto until = Clock::now() + cancel_patience; Clock::now() < until;) {
      const std::vector<QueuedTask> tasks = queued();
      if (tasks.empty()) return;
      std::vector<std::string> words = {"scancel"};
      for (const QueuedTask& task : tasks) {
        if (std::find(words.begin(), words.end(), task.job) == words.end()) words.push_back(task.job);
      }
      (void)run_command(words);
      std::this_thread::sleep_for(std::chrono::milliseconds(300));
    }
    throw OutsideError("the array could not be cancelled in time: scancel --name=" + job_name(job_));
  }

  // Finished: all goes. Else the stores stay, for the same command to go on with.
  void sweep_up(bool finished) const {
    const std::string mark = "-of-" + std::to_string(job_.shards) + ".";
    std::error_code none;
    for (const auto& entry : fs::directory_iterator(job_.folder, none)) {
      const std::string name = entry.path().filename().string();
      const bool of_shard = name.find(mark) != std::string::npos;
      const bool is_store = name.ends_with(".sqlite") || name.find(".partial") != std::string::npos;
      if ((of_shard && (finished || !is_store)) || name == "jobs" || name == "task.sh") fs::remove(entry.path(), none);
    }
    fs::remove(job_.folder, none);  // only where it is empty
  }

  const SweepPlan& plan_;
  Store& store_;
  const ClusterJob& job_;
  ClusterOutcome outcome_;
  std::vector<std::string> jobs_;
  std::vector<std::uint64_t> all_, wanted_;  // shards; of them not finished
  std::map<std::uint64_t, QueuedTask> queue_;
  std::map<std::uint64_t, unsigned> starts_, absent_;
  bool deaf_ = false;
};

}  // namespace

std::uint64_t usual_shards(const SweepPlan& plan) {
  return std::min<std::uint64_t>(16, (plan.cases() + cases_per_unit - 1) / cases_per_unit * plan.runs);
}

ClusterOutcome run_on_cluster(const SweepPlan& plan, Store& store, const ClusterJob& job,
                              const std::function<bool(const ClusterProgress&)>& keep_going) {
  for (const char* command : {"sbatch", "squeue", "scancel"}) {
    try {
      (void)run_command({command, "--version"});
    } catch (const OutsideError& e) {
      throw OutsideError(
          std::string(e.what()) +
          ": --on slurm submits to a Slurm that is there, through sbatch, squeue and scancel; start it on a "
          "machine of that cluster, or run here without --on slurm");
    }
  }
  Cluster cluster(plan, store, job);
  try {
    return cluster.run(keep_going);
  } catch (...) {
    cluster.give_up();
    throw;
  }
}

}  // namespace slipbench
