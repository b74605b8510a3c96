#include "sim/sweep/cluster.hpp"

#include <algorithm>
#include <charconv>
#include <sstream>
#include <utility>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

constexpr const char* queue_format = "%F|%K|%T|%j|%r";

bool whole(const std::string& text, std::uint64_t& value) {
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  return error == std::errc() && end == text.data() + text.size();
}

}  // namespace

std::string shard_name(const ClusterJob& job, std::uint64_t shard) {
  return std::to_string(shard) + "-of-" + std::to_string(job.shards);
}

std::string shard_file(const ClusterJob& job, std::uint64_t shard, const std::string& ending) {
  return job.folder + "/" + shard_name(job, shard) + ending;
}

std::string job_name(const ClusterJob& job) {
  std::uint64_t hash = 14695981039346656037u;  // FNV-1a
  for (const char c : job.folder) hash = (hash ^ static_cast<unsigned char>(c)) * 1099511628211u;
  return "slipbench-" + std::to_string(hash);
}

std::string shell_quoted(const std::string& text) {
  std::string out = "'";
  for (const char c : text) out += c == '\'' ? std::string("'\\''") : std::string(1, c);
  return out + "'";
}

std::string task_script(const ClusterJob& job) {
  std::string sweep = shell_quoted(job.program);
  for (const std::string& word : job.sweep) sweep += " " + shell_quoted(word);
  const std::string shards = std::to_string(job.shards);
  std::string script = R"sh(#!/bin/sh
# One shard of a sweep, number $SLURM_ARRAY_TASK_ID. Written by slipbench, and removed by it at the end.
sweep() {
  @SWEEP "$@"
}
cd @FOLDER || exit 3
name=@STORES/$SLURM_ARRAY_TASK_ID-of-@SHARDS
store=$name.sqlite
[ -e "$store" ] && exit 0
echo "$SLURM_JOB_ID ${SLURM_RESTART_COUNT:-0} $(hostname)" >>"$name.attempts"
if [ "$(wc -l <"$name.attempts")" -gt @STARTS ]; then
  echo "started more than @STARTS times" >&2
  echo 3 >"$name.failed"
  exit 3
fi
attempt=$name.$SLURM_JOB_ID.${SLURM_RESTART_COUNT:-0}.partial
# What an older attempt had finished. One that still writes (on a machine given up for lost) is in use, and left alone.
for older in "$name".*.partial; do
  if [ -e "$older" ] && [ "$older" != "$attempt" ]; then
    sweep --merge "$older" --store "$attempt" --quiet >/dev/null 2>&1
  fi
done
sweep --shard "$SLURM_ARRAY_TASK_ID/@SHARDS" --store "$attempt" --threads "${SLURM_CPUS_PER_TASK:-1}" --quiet --progress
status=$?
if [ "$status" -le 1 ]; then  # 1: all is there, and some of it bad
  mv "$attempt" "$store" && rm -f "$name".*.partial*
  exit 0
fi
[ "$status" -lt 128 ] && echo "$status" >"$name.failed"
exit "$status"
)sh";
  const std::pair<const char*, std::string> blanks[] = {{"@SWEEP", sweep},
                                                        {"@FOLDER", shell_quoted(job.working_folder)},
                                                        {"@STORES", shell_quoted(job.folder)},
                                                        {"@SHARDS", shards},
                                                        {"@STARTS", std::to_string(most_starts)}};
  std::string filled;  // in one pass: what is filled in may hold anything
  for (std::size_t at = 0; at < script.size();) {
    bool found = false;
    for (const auto& [blank, text] : blanks) {
      if (script.compare(at, std::string(blank).size(), blank) != 0) continue;
      filled += text;
      at += std::string(blank).size();
      found = true;
      break;
    }
    if (!found) filled += script[at++];
  }
  return filled;
}

std::string array_text(const std::vector<std::uint64_t>& shards) {
  std::string text;
  for (std::size_t i = 0; i < shards.size();) {
    std::size_t last = i;
    while (last + 1 < shards.size() && shards[last + 1] == shards[last] + 1) ++last;
    text += (text.empty() ? "" : ",") + std::to_string(shards[i]);
    if (last > i) text += "-" + std::to_string(shards[last]);
    i = last + 1;
  }
  return text;
}

std::vector<std::string> submit_command(const ClusterJob& job, const std::string& script,
                                        const std::vector<std::uint64_t>& shards) {
  std::vector<std::string> words = {"sbatch", "--parsable", "--requeue", "--open-mode=append"};
  words.push_back("--job-name=" + job_name(job));
  words.push_back("--array=" + array_text(shards));
  words.push_back("--output=" + job.folder + "/%a-of-" + std::to_string(job.shards) + ".log");
  if (job.threads > 0) words.push_back("--cpus-per-task=" + std::to_string(job.threads));
  for (const std::string& option : job.pass) words.push_back("--" + option);
  words.push_back(script);
  return words;
}

std::string pass_option(const std::string& text) {
  const std::string option = text.starts_with("--") ? text.substr(2) : text;
  const std::string name = option.substr(0, option.find('='));
  const auto refuse = [&](const std::string& why) {
    throw InputError("command line", "--slurm", "--slurm '" + text + "': " + why, "usage");
  };
  if (name.size() < 2 || name.front() == '-' ||
      name.find_first_not_of("abcdefghijklmnopqrstuvwxyz0123456789-") != std::string::npos)
    refuse("expected an option of sbatch by its long name, as in --slurm partition=main or --slurm time=2:00:00");
  for (const char* ours : {"array", "error", "job-name", "open-mode", "output", "parsable", "requeue", "no-requeue",
                           "test-only", "wait", "wrap", "chdir", "quiet", "input", "help", "version", "dependency"}) {
    if (name == ours) refuse("that one is set by the sweep itself");
  }
  return option;
}

std::vector<std::string> queue_command(const std::vector<std::string>& jobs) {
  std::string list;
  for (const std::string& job : jobs) list += (list.empty() ? "" : ",") + job;
  return {"squeue", "-h", "-r", "-j", list, "-o", queue_format};
}

std::vector<QueuedTask> parse_queue(const std::string& text) {
  std::vector<QueuedTask> tasks;
  std::istringstream lines(text);
  for (std::string line; std::getline(lines, line);) {
    std::istringstream parts(line);
    QueuedTask task;
    std::string shard;
    std::getline(parts, task.job, '|');
    std::getline(parts, shard, '|');
    std::getline(parts, task.state, '|');
    std::getline(parts, task.name, '|');
    std::getline(parts, task.reason);
    if (whole(shard, task.shard)) tasks.push_back(task);
  }
  return tasks;
}

double share_in_log(const std::string& text) {
  for (std::size_t at = text.rfind(" %"); at != std::string::npos && at > 0; at = text.rfind(" %", at - 1)) {
    std::size_t first = at;
    while (first > 0 && text[first - 1] >= '0' && text[first - 1] <= '9') --first;
    std::uint64_t percent = 0;
    if (first < at && whole(text.substr(first, at - first), percent))
      return static_cast<double>(std::min<std::uint64_t>(percent, 100)) / 100.0;
  }
  return 0.0;
}

}  // namespace slipbench
