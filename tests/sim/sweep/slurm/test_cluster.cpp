// What is handed to Slurm and read from it, without one: command lines, the task's script, the queue.
#include <sys/stat.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>

#include "sim/scenario/input_error.hpp"
#include "sim/sweep/cluster.hpp"
#include "sim/sweep/command_run.hpp"

using namespace slipbench;
using Catch::Contains;

namespace {

namespace fs = std::filesystem;

ClusterJob job_in(const std::string& folder) {
  ClusterJob job;
  job.program = "/opt/odd dir/slip'bench";
  job.sweep = {"sweep", "plan $HOME.toml", "--set", "title=it's \"@SHARDS\""};
  job.working_folder = folder;
  job.folder = folder + "/a store.sqlite.shards";
  job.shards = 3;
  return job;
}

}  // namespace

TEST_CASE("cluster: array indices as ranges", "[sweep][cluster]") {
  CHECK(array_text({0, 1, 2, 3, 7}) == "0-3,7");
  CHECK(array_text({5}) == "5");
  CHECK(array_text({0, 2, 4, 5}) == "0,2,4-5");
}

TEST_CASE("cluster: the command that submits", "[sweep][cluster]") {
  ClusterJob job = job_in("/data");
  job.threads = 4;
  job.pass = {pass_option("partition=main"), pass_option("--exclusive"), pass_option("nodelist=n[1-2]")};
  const auto words = submit_command(job, "/data/task.sh", {0, 2});
  CHECK(words.front() == "sbatch");
  CHECK(words.back() == "/data/task.sh");
  for (const char* word : {"--array=0,2", "--partition=main", "--exclusive", "--nodelist=n[1-2]", "--cpus-per-task=4",
                           "--requeue", "--open-mode=append", "--output=/data/a store.sqlite.shards/%a-of-3.log"}) {
    INFO(word);
    CHECK(std::find(words.begin(), words.end(), word) != words.end());
  }
  for (const char* bad : {"array=1-4", "--wrap=x", "", "-p", "Partition=x", "a b"}) {
    INFO(bad);
    CHECK_THROWS_AS(pass_option(bad), InputError);
  }
  ClusterJob other = job;
  other.folder += "2";
  CHECK(job_name(job) != job_name(other));
}

TEST_CASE("cluster: the queue as squeue prints it", "[sweep][cluster]") {
  // Printed by squeue 22.05.8 with that format.
  const auto tasks = parse_queue(
      "17|2|PENDING|slipbench-1|None\n17|0|RUNNING|slipbench-1|None\n17|5|PENDING|slipbench-1|launch failed requeued "
      "held\n"
      "18|N/A|RUNNING|other|None\n");
  REQUIRE(tasks.size() == 3);
  CHECK(tasks[0].job == "17");
  CHECK(tasks[0].shard == 2);
  CHECK(tasks[0].name == "slipbench-1");
  CHECK_FALSE(tasks[0].runs());
  CHECK_FALSE(tasks[0].given_up());
  CHECK(tasks[1].runs());
  CHECK(tasks[2].given_up());
  CHECK(parse_queue("").empty());
  CHECK(queue_command({"17", "19"})[4] == "17,19");
}

TEST_CASE("cluster: how far a shard is, from its log", "[sweep][cluster]") {
  CHECK(share_in_log("sweep:   3 %, 5 s left\nsweep:  45 %, 3 s left\n") == 0.45);
  CHECK(share_in_log("sweep: 100 %, 0 s left\nsomething else\n") == 1.0);
  CHECK(share_in_log("") == 0.0);
  CHECK(share_in_log(" % no number") == 0.0);
}

TEST_CASE("cluster: the task's script, run by sh with odd names", "[sweep][cluster]") {
  const fs::path folder = fs::temp_directory_path() / ("slipbench-cluster '" + std::to_string(::getpid()));
  ClusterJob job = job_in(folder.string());
  fs::create_directories(job.folder);
  // Stands in for the program: notes its words, and makes the store that it is asked for. The real one runs in test_slurm.py.
  job.program = (folder / "pro'gram").string();
  const auto program = [&](int status) {
    std::ofstream(job.program) << "#!/bin/sh\nfor w; do echo \"$w\" >>words; done\n"
                               << "while [ $# -gt 1 ]; do [ \"$1\" = --store ] && : >\"$2\"; shift; done\nexit "
                               << status << "\n";
    ::chmod(job.program.c_str(), 0755);
  };
  const std::string script = (folder / "task.sh").string();
  std::ofstream(script) << task_script(job);
  const auto run = [&](const std::string& number) {
    return run_command(
        {"env", "SLURM_ARRAY_TASK_ID=1", "SLURM_JOB_ID=" + number, "SLURM_CPUS_PER_TASK=2", "sh", script});
  };

  program(137);  // as a program that was killed
  CHECK(run("40").status == 137);
  CHECK(fs::exists(shard_file(job, 1, ".40.0.partial")));
  CHECK_FALSE(fs::exists(shard_file(job, 1, ".failed")));
  program(3);
  CHECK(run("41").status == 3);
  CHECK(fs::exists(shard_file(job, 1, ".failed")));
  fs::remove(folder / "words");
  program(1);  // all there, and some of it bad
  const CommandOutcome good = run("42");
  INFO(good.err);
  CHECK(good.status == 0);
  CHECK(fs::exists(shard_file(job, 1, ".sqlite")));
  for (const auto& entry : fs::directory_iterator(job.folder))
    CHECK(entry.path().string().find(".partial") == std::string::npos);
  std::ifstream file(folder / "words");
  std::vector<std::string> words;
  for (std::string word; std::getline(file, word);) words.push_back(word);
  const std::string text = job.sweep[3];
  CHECK(std::count(words.begin(), words.end(), text) == 3);  // two older attempts taken over, then the run itself
  CHECK(std::count(words.begin(), words.end(), "--merge") == 2);
  CHECK(std::count(words.begin(), words.end(), "1/3") == 1);
  CHECK(std::count(words.begin(), words.end(), "plan $HOME.toml") == 3);

  fs::remove(folder / "words");
  CHECK(run("43").status == 0);  // there already: nothing runs
  CHECK_FALSE(fs::exists(folder / "words"));
  fs::remove(shard_file(job, 1, ".sqlite"));
  program(137);
  (void)run("44");
  CHECK(run("45").status == 3);  // the fifth start
  fs::remove_all(folder);
}

TEST_CASE("commands: outputs, status, none such", "[sweep][cluster]") {
  const CommandOutcome both = run_command({"sh", "-c", "echo out; echo err >&2; exit 7"});
  CHECK(both.out == "out\n");
  CHECK(both.err == "err\n");
  CHECK(both.status == 7);
  CHECK(run_command({"sh", "-c", "kill -9 $$"}).status == 137);
  CHECK(run_command({"sh", "-c", "head -c 1000000 /dev/zero; head -c 1000000 /dev/zero >&2"}).out.size() == 1000000);
  CHECK_THROWS_WITH(run_command({"no-such-program-here"}), Contains("cannot run 'no-such-program-here'"));
}
