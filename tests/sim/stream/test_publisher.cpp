// A stream as its readers see it: the trace's rows to the bit, described before they come, ended with what became of the run.
// libzmq is not built for the thread sanitizer, which then sees races in every message that changes hands: not for it.
#ifndef __SANITIZE_THREAD__
#include <unistd.h>
#include <catch2/catch.hpp>

#include <bit>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "sim/engine/simulate.hpp"
#include "sim/record/csv_trace.hpp"
#include "tests/published/sensorless_drive.hpp"
#include "tests/sim/stream/client.hpp"

using namespace slipbench;
using namespace slipbench::published;
using slipbench::test::Account;
using slipbench::test::Client;
using slipbench::test::Feed;
using slipbench::test::feed_info;
using slipbench::test::Reader;
using slipbench::test::Received;

namespace {

std::string ipc_path() {
  static int n = 0;
  return (std::filesystem::temp_directory_path() /
          ("slipbench-stream-" + std::to_string(::getpid()) + "-" + std::to_string(n++)))
      .string();
}

std::vector<std::vector<double>> csv_columns(const std::string& path, std::vector<std::string>& names) {
  std::ifstream file(path);
  std::string line, cell;
  std::getline(file, line);
  for (std::istringstream cells(line); std::getline(cells, cell, ',');) names.push_back(cell);
  std::vector<std::vector<double>> columns(names.size());
  while (std::getline(file, line)) {
    std::size_t i = 0;
    for (std::istringstream cells(line); std::getline(cells, cell, ',');) columns.at(i++).push_back(std::stod(cell));
  }
  return columns;
}

bool same(double a, double b) {  // the CSV keeps no sign of a NaN
  return (std::isnan(a) && std::isnan(b)) || std::bit_cast<std::uint64_t>(a) == std::bit_cast<std::uint64_t>(b);
}

}  // namespace

TEST_CASE("stream: names, units and rows are the trace's, to the bit", "[stream][contract]") {
  const std::string transport = GENERATE(std::string("tcp://127.0.0.1:*"), "ipc://" + ipc_path());
  Scenario s = inverter_drive(krause_3hp(), 0.6, 8.0, "measured");
  s.run.duration_s = 0.5;
  s.run.trace_period_s = s.run.control_period_s;
  const std::string path = ipc_path() + ".csv";
  CsvTrace trace(path);
  StreamPublisher publisher(parse_endpoint(transport), {"1.2.3", "A title", 77});
  Client client(publisher.endpoint());
  publisher.wait_for(1, [] { return true; });
  const std::array<RunObserver*, 2> observers{&trace, &publisher};
  std::vector<Received> all;
  std::thread reader([&] {
    for (auto r = client.next(); r; r = client.next()) {
      all.push_back(std::move(*r));
      if (all.back().topic == "end") break;
    }
  });
  const RunOutcome outcome = simulate(s, observers);
  const StreamFigures figures = publisher.finish("done");
  reader.join();
  trace.finish();
  std::vector<std::string> names;
  const auto columns = csv_columns(path, names);
  std::filesystem::remove(path);

  REQUIRE(all.size() > 2);
  const Received& d = all.front();
  REQUIRE(d.topic == "describe");
  CHECK(d.at<int>("version") == 1);
  CHECK(d.at<std::string>("slipbench") == "1.2.3");
  CHECK(d.at<std::string>("scenario") == "A title");
  CHECK(d.at<int>("seed") == 77);
  const auto run = d.at<std::string>("run");
  CHECK(run.size() == 16);
  CHECK(run.find_first_not_of("0123456789abcdef") == std::string::npos);
  for (const char* key : {"period_s", "duration_s"}) CHECK(d.map.at(key).type == msgpack::type::FLOAT64);
  CHECK(d.at<double>("period_s") == s.run.trace_period_s);
  CHECK(d.at<double>("duration_s") == 0.5);
  REQUIRE(d.columns() == names.size());
  for (std::size_t c = 0; c < names.size(); ++c) {
    const auto column = d.map.at("columns").via.array.ptr[c].as<std::map<std::string, std::string>>();
    CHECK(column.at("name") == names[c]);
    CHECK(column.count("unit") == 1);
    CHECK(column.count("meaning") == 1);
  }

  std::size_t row = 0, differ = 0;
  std::int64_t sequence = 0;
  for (const Received& r : all) {
    CHECK(r.at<std::string>("run") == run);
    if (r.topic != "samples") continue;
    CHECK(r.at<std::int64_t>("sequence") == sequence++);
    REQUIRE(r.at<std::size_t>("first_tick") == row);
    REQUIRE(r.columns() == names.size());
    CHECK(r.map.at("period_s").type == msgpack::type::FLOAT64);
    for (std::size_t c = 0; c < names.size(); ++c) {
      const std::vector<double> values = r.column(c);
      for (std::size_t k = 0; k < values.size(); ++k) differ += !same(values[k], columns[c].at(row + k));
    }
    row += r.at<std::size_t>("rows");
  }
  CHECK(differ == 0);
  CHECK(row == columns[0].size());
  const Received& end = all.back();
  REQUIRE(end.topic == "end");
  CHECK(end.at<std::string>("status") == "done");
  CHECK(end.at<std::int64_t>("blocks") == sequence);
  CHECK(end.at<std::size_t>("rows") == row);
  CHECK(end.at<int>("dropped") == 0);
  CHECK(end.at<int>("missed") == 0);
  CHECK(figures.blocks == sequence);
  CHECK(figures.rows == static_cast<std::int64_t>(row));
  CHECK(figures.dropped == 0);
  CHECK(figures.subscribers == 1);
  CHECK_FALSE(outcome.diverged);
}

TEST_CASE("stream: a late subscriber is told the columns first, and then gets all that follows", "[stream][contract]") {
  StreamPublisher publisher(parse_endpoint("*"), {});
  publisher.begin(feed_info(1.0));
  Feed feed(publisher);
  feed.rows(5000);  // nobody listens
  Reader late(publisher.endpoint());
  late.start();
  // Rows go on until it has seen some; ten seconds are the reader's own patience.
  for (int i = 0; i < 1000 && late.blocks() == 0; ++i) {
    feed.rows(1024);
    std::this_thread::sleep_for(std::chrono::milliseconds(10));
  }
  feed.rows(100000);
  publisher.end();
  const StreamFigures figures = publisher.finish("diverged");
  const Account account = late.join();
  CHECK(account.described_first);
  CHECK(account.wrong == 0);
  CHECK(account.next_sequence == account.end_blocks);
  CHECK(account.gaps == account.end_blocks - account.blocks);  // only what came before it
  CHECK(account.missed == 0);
  CHECK(account.end_rows == figures.rows);
  CHECK(account.status == "diverged");
}

TEST_CASE("stream: a block waits a tenth of a second at most, and columns are told anew each second",
          "[stream][contract]") {
  StreamPublisher publisher(parse_endpoint("*"), {});
  Client client(publisher.endpoint(), {"samp", "describe", "end"});
  publisher.wait_for(1, [] { return true; });
  publisher.begin(feed_info(1.0));
  Feed feed(publisher);
  const auto now = [] { return std::chrono::steady_clock::now(); };
  const auto begun = now();
  int describes = 0, blocks = 0, rows = 0;
  while (now() - begun < std::chrono::milliseconds(2500)) {
    feed.row();
    publisher.control_tick({});
    std::this_thread::sleep_for(std::chrono::milliseconds(1));
  }
  publisher.end();
  publisher.finish("interrupted");
  std::string status;
  while (const auto r = client.next(1000)) {
    describes += r->topic == "describe";
    blocks += r->topic == "samples";
    if (r->topic == "samples") rows += r->at<int>("rows");
    if (r->topic == "end") status = r->at<std::string>("status");
    if (r->topic == "end") break;
  }
  CHECK(status == "interrupted");
  CHECK(rows > 500);      // of 2500 on an idle machine
  CHECK(describes >= 3);  // at 0, 1 and 2 s
  CHECK(blocks >= 12);    // of 25: a busy machine may hold the sending thread up for half of the time
  CHECK(blocks <= 27);    // and no more than one each tenth of a second, with the first and the last
}

TEST_CASE("stream: waiting for subscribers counts them, and can be broken off", "[stream][command]") {
  StreamPublisher publisher(parse_endpoint("*"), {});
  int asked = 0;
  publisher.wait_for(1, [&] { return ++asked < 3; });
  CHECK(asked == 3);
  const Client one(publisher.endpoint());
  const Client deaf(publisher.endpoint(), {"describe"});  // covers no samples: not counted
  asked = 0;
  publisher.wait_for(2, [&] { return ++asked < 10; });
  CHECK(asked == 10);
  {
    const Client two(publisher.endpoint(), {"samples", "end", "describe"});
    publisher.wait_for(2, [&] { return ++asked < 1000; });
    CHECK(asked < 1000);
  }
  // Whoever has gone no longer counts: two more are needed to make three... one of them is not enough.
  publisher.wait_for(3, [n = 0]() mutable { return ++n < 6; });
  const Client three(publisher.endpoint());
  asked = 0;
  publisher.wait_for(3, [&] { return ++asked < 10; });
  CHECK(asked == 10);
  const Client four(publisher.endpoint());
  publisher.wait_for(3, [&] { return ++asked < 1000; });
  CHECK(asked < 1000);
}

TEST_CASE("stream: every run has another name, and one that never began ends quietly", "[stream][property]") {
  StreamPublisher never(parse_endpoint("*"), {});
  const StreamFigures figures = never.finish("interrupted");
  CHECK(figures.blocks == 0);
  std::vector<std::string> runs;
  for (int i = 0; i < 2; ++i) {
    StreamPublisher publisher(parse_endpoint("*"), {});
    Client client(publisher.endpoint());
    publisher.wait_for(1, [] { return true; });
    publisher.begin(feed_info(1.0));
    publisher.end();
    publisher.finish("done");
    const auto first = client.next();
    REQUIRE(first);
    runs.push_back(first->at<std::string>("run"));
  }
  CHECK(runs[0] != runs[1]);
}

#endif
