// A sweep as an array of shards for Slurm: the files it uses, what is submitted, and how the queue is read. No state, no waiting.
//
// In FOLDER, which all machines see, shard i of n leaves
//   i-of-n.sqlite                      its store, finished: an attempt takes this name only when it is complete
//   i-of-n.JOB.RESTART.partial         the store of one attempt: two copies of a task never write to one file
//   i-of-n.log, .attempts, .failed     what it printed; one line a start; its exit status, where starting it again would not help
// A new attempt first takes over the rows of older ones.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace slipbench {

struct ClusterJob {
  std::string program;             // this program, as all machines see it
  std::vector<std::string> sweep;  // its arguments up to the shard: sweep PLAN --set ...
  std::string working_folder;      // the plan is named relative to it
  std::string folder;              // of the shards' stores
  std::uint64_t shards = 1;
  unsigned threads = 0;           // a task; 0: as many as Slurm grants it, 1 unless asked
  std::vector<std::string> pass;  // options for sbatch: "partition=main"
};

inline constexpr unsigned most_starts = 4;  // of a shard: the first, and three after it was lost

std::string shard_name(const ClusterJob& job, std::uint64_t shard);  // "3-of-8"
std::string shard_file(const ClusterJob& job, std::uint64_t shard, const std::string& ending);
std::string job_name(const ClusterJob& job);  // tells the jobs of one folder from all others
// For /bin/sh: one argument, whatever it holds.
std::string shell_quoted(const std::string& text);
// What each task of the array runs.
std::string task_script(const ClusterJob& job);
// "0-3,7"; rising numbers.
std::string array_text(const std::vector<std::uint64_t>& shards);
std::vector<std::string> submit_command(const ClusterJob& job, const std::string& script,
                                        const std::vector<std::uint64_t>& shards);
// Throws InputError for an option of sbatch that is ours to set, or none.
std::string pass_option(const std::string& text);

struct QueuedTask {
  std::string job;  // number of the array
  std::uint64_t shard = 0;
  std::string state, reason, name;
  [[nodiscard]] bool runs() const { return state == "RUNNING" || state == "COMPLETING"; }
  // Slurm gave it up: it waits for somebody to let it go.
  [[nodiscard]] bool given_up() const {
    return state == "PENDING" && reason.find("requeued held") != std::string::npos;
  }
};

std::vector<std::string> queue_command(const std::vector<std::string>& jobs);
// What that prints; lines that are no task of an array are left out.
std::vector<QueuedTask> parse_queue(const std::string& text);
// The last "NN %" in what a shard printed of its progress, 0..1.
double share_in_log(const std::string& text);

}  // namespace slipbench
