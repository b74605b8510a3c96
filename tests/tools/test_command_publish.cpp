// The built command with --publish, --publish-wait and --pace: what a subscriber gets is the trace, how the run ended, and what
// scripts read of it.
// libzmq is not built for the thread sanitizer, which then sees races in every message that changes hands: not for it.
#ifndef __SANITIZE_THREAD__
#include <catch2/catch.hpp>

#include <chrono>
#include <thread>

#include "tests/sim/stream/client.hpp"
#include "tests/tools/command.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

// What a client sees of `run FILE --publish ...`, from the first message to `end`.
struct Seen {
  Answer answer;
  std::int64_t rows = 0;
  std::string scenario, status;
  std::vector<double> speed;
};
Seen watch(const Folder& folder, std::vector<std::string> arguments, const std::string& before = "") {
  const std::string endpoint = "ipc://" + folder.file("stream");
  for (const char* word : {"--publish", endpoint.c_str(), "--publish-wait", "1", "--json"})
    arguments.emplace_back(word);
  Seen seen;
  Client client(endpoint);  // connects as soon as the command has bound
  std::thread command([&] { seen.answer = folder.run(arguments, before); });
  while (const auto r = client.next(30000)) {
    if (r->topic == "describe") seen.scenario = r->at<std::string>("scenario");
    if (r->topic == "samples") {
      seen.rows += r->at<std::int64_t>("rows");
      const std::vector<double> speed = r->column(1);
      seen.speed.insert(seen.speed.end(), speed.begin(), speed.end());
    }
    if (r->topic != "end") continue;
    seen.status = r->at<std::string>("status");
    break;
  }
  command.join();
  return seen;
}

std::vector<double> csv_column(const std::string& path, std::size_t index) {
  std::istringstream lines(content(path));
  std::string line, cell;
  std::getline(lines, line);
  std::vector<double> values;
  while (std::getline(lines, line)) {
    std::istringstream cells(line);
    for (std::size_t i = 0; i <= index; ++i) std::getline(cells, cell, ',');
    values.push_back(std::stod(cell));
  }
  return values;
}

}  // namespace

TEST_CASE("publish: a subscriber gets the trace, and JSON says what went out", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Seen seen = watch(folder, {"run", file, "--trace", folder.file("t.csv")});
  INFO(seen.answer.err);
  REQUIRE(seen.answer.status == 0);
  CHECK(seen.status == "done");
  CHECK(seen.scenario == "Short test drive, data invented");
  CHECK(seen.rows == 3001);
  CHECK(seen.speed == csv_column(folder.file("t.csv"), 1));
  const auto stream = seen.answer.json()["stream"];
  CHECK(stream["endpoint"] == "ipc://" + folder.file("stream"));
  CHECK(stream["subscribers"] == 1);
  CHECK(stream["rows"] == 3001);
  CHECK(stream["blocks"].get<int>() >= 1);
  CHECK(stream["dropped"] == 0);
  CHECK_THAT(seen.answer.err, Catch::Contains("publishing on ipc://") && Catch::Contains("waiting for 1 subscriber"));
  // The results are those of a run that nobody watches.
  const auto alone = folder.run({"run", file, "--json"}).json();
  CHECK(alone["digest"] == seen.answer.json()["digest"]);
  CHECK_FALSE(alone.contains("stream"));
}

TEST_CASE("publish: without a title the file's name stands for it", "[tools][contract]") {
  const Folder folder;
  const std::string file =
      folder.write("untitled.toml", replaced(scenario_text(), "title = \"Short test drive, data invented\"", ""));
  CHECK(watch(folder, {"run", file}).scenario == "untitled.toml");
}

TEST_CASE("publish: the end says that a run diverged, or was interrupted", "[tools][command]") {
  const Folder folder;
  // Forward Euler at 4 ms on mains: see test_command_run.
  std::string text = scenario_text();
  for (const char* key : {"plant_step_s = 50e-6", "control_period_s = 100e-6", "trace_period_s = 100e-6"}) {
    text = replaced(text, key, std::string(key).substr(0, std::string(key).find('=')) + "= 4e-3");
  }
  text = replaced(text, "duration_s = 0.3", "duration_s = 100.0");
  text = replaced(text, "method = \"rk4\"", "method = \"euler\"");
  text = text.substr(0, text.find("[supply]")) +
         "[supply]\nkind = \"mains\"\nline_voltage_V = 400.0\nfrequency_Hz = 50.0\n";
  text = replaced(text, "start = \"magnetised\"", "start = \"standstill\"");
  const Seen diverged = watch(folder, {"run", folder.write("d.toml", text)});
  CHECK(diverged.answer.status == 1);
  CHECK(diverged.status == "diverged");
  CHECK(diverged.rows > 0);

  const std::string file =
      folder.write("s.toml", replaced(scenario_text(), "duration_s = 0.3", "duration_s = 100000.0"));
  // Slowed down a hundredfold: Ctrl-C must not wait for the pace.
  const auto begun = std::chrono::steady_clock::now();
  const Seen stopped =
      watch(folder, {"run", file, "--pace", "0.01"}, "timeout --foreground --preserve-status --signal=INT 1.5");
  CHECK(stopped.answer.status == 130);
  CHECK(stopped.status == "interrupted");
  CHECK(stopped.rows > 0);
  CHECK(std::chrono::steady_clock::now() - begun < std::chrono::seconds(10));  // 1.5 s and a busy machine; 41 s else
}

TEST_CASE("publish: an interrupt while waiting for subscribers ends the wait", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"run", file, "--json", "--publish", "*", "--publish-wait", "2"},
                                   "timeout --foreground --preserve-status --signal=INT 1.0");
  CHECK(answer.status == 130);
  CHECK(answer.json()["stream"]["subscribers"] == 0);
}

TEST_CASE("publish: an open network is warned of, a bad endpoint is 2, a taken one 3", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  CHECK_THAT(folder.run({"run", file, "--publish", "tcp://0.0.0.0:*"}).err, Catch::Contains("warning: not loopback"));
  const Answer local = folder.run({"run", file, "--publish", "*"});
  CHECK_THAT(local.err, !Catch::Contains("warning"));
  CHECK_THAT(local.out, Catch::Contains("stream: tcp://127.0.0.1:"));
  CHECK(folder.run({"run", file, "--publish", "*", "--quiet"}).err.empty());
  const Answer bad = folder.run({"run", file, "--json", "--publish", "udp://127.0.0.1:5600"});
  CHECK(bad.status == 2);
  CHECK(bad.json()["error"]["key"] == "--publish");
  CHECK(bad.json()["error"]["place"] == "command line");
  CHECK(bad.json()["error"]["code"] == "usage");
  CHECK(folder.run({"run", file, "--publish-wait", "1"}).status == 2);
  CHECK(folder.run({"check", file, "--publish", "*"}).status == 2);
  for (const char* pace : {"0", "-1", "nan", "inf", "fast", "1x", ""}) {
    CHECK(folder.run({"run", file, "--pace", pace}).status == 2);
  }
  const StreamPublisher other(parse_endpoint("*"), {});
  const Answer taken = folder.run({"run", file, "--json", "--publish", other.endpoint()});
  CHECK(taken.status == 3);
  CHECK_THAT(taken.json()["error"]["message"].get<std::string>(),
             Catch::Contains("in use") && Catch::Contains(other.endpoint()));
}

TEST_CASE("pace: a run takes the time it is told to, and its results stay the same", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const auto free = folder.run({"run", file, "--json"}).json();
  const auto paced = folder.run({"run", file, "--json", "--pace", "0.5"}).json();
  CHECK(paced["wall_s"].get<double>() >=
        0.6 - 0.005);                          // 0.3 s at half of real time; the last look is 2 ms before the end
  CHECK(paced["wall_s"].get<double>() < 3.0);  // a busy machine
  CHECK(free["wall_s"].get<double>() < paced["wall_s"].get<double>());
  CHECK(paced["digest"] == free["digest"]);
}

#endif
