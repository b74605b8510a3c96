// sweep --on slurm, as far as it goes without a Slurm; tests/sim/sweep/slurm starts a real one.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;
using Catch::Contains;

TEST_CASE("slurm: refusals on the command line, and no sbatch here", "[tools][command][contract]") {
  const Folder folder;
  folder.write("drive.toml", scenario_text());
  const std::string plan =
      folder.write("plan.toml", "scenario = \"drive.toml\"\n[[vary]]\nkey = \"belief.inertia\"\nvalues = [0.8, 1.2]\n");
  const std::string store = folder.file("s.sqlite");
  const auto told = [&](std::vector<std::string> more, const std::string& before = "") {
    std::vector<std::string> all = {"sweep", plan, "--store", store};
    all.insert(all.end(), more.begin(), more.end());
    return folder.run(all, before);
  };
  const auto refused = [&](const std::vector<std::string>& more, const std::string& text) {
    const Answer answer = told(more);
    CHECK(answer.status == 2);
    CHECK_THAT(answer.err, Contains(text));
  };
  refused({"--on", "slurn"}, "the nearest is slurm");
  refused({"--slurm", "partition=x"}, "--slurm needs --on slurm");
  refused({"--shards", "2"}, "--shards needs --on slurm");
  refused({"--on", "slurm", "--shard", "0/2"}, "--shard does not go with --on slurm");
  refused({"--on", "slurm", "--slurm", "array=1-2"}, "set by the sweep itself");
  refused({"--on", "slurm", "--shards", "2"}, "this plan has 1");
  CHECK(told({"--on", "local", "--quiet"}).status == 0);
  const Answer none = told({"--on", "slurm"}, "env PATH=/nonexistent");
  CHECK(none.status == 3);
  CHECK_THAT(none.err, Contains("cannot run 'sbatch'") && Contains("without --on slurm"));
  CHECK_FALSE(fs::exists(store + ".shards"));
}
