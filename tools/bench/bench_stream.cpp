// The stream: what it carries beside a bare ZeroMQ pair, whether anything is lost at 1e6 rows a second, what it costs the run.
//
//   bench_stream [ROWS]      rows of the first part: 1e8 by default, 100 s and 12.8 GB
//
// Subscribers are processes of their own, over TCP on loopback. Rows have 16 columns. The ratios stand beside figures
// measured in turns in the same minute: `of_bare` is the bytes a second of the stream, fed as fast as it takes them, over those
// of a PUSH and PULL pair with the same frames; `of_alone` is a run's time with the publisher over its time without.
#include <signal.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <fstream>
#include <memory>
#include <string>
#include <thread>
#include <vector>

#include "sim/engine/simulate.hpp"
#include "sim/record/digest.hpp"
#include "sim/scenario/read.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "sim/score/means.hpp"
#include "sim/stream/publisher.hpp"

namespace {

using namespace slipbench;
using Clock = std::chrono::steady_clock;

constexpr std::size_t columns = 16, block_rows = 1024;
double since(Clock::time_point begun) { return std::chrono::duration<double>(Clock::now() - begun).count(); }
double median(std::vector<double> all) {
  std::nth_element(all.begin(), all.begin() + static_cast<std::ptrdiff_t>(all.size() / 2), all.end());
  return all[all.size() / 2];
}

struct Tally {
  std::int64_t messages = 0, bytes = 0;
};

// A subscriber in a process of its own: connects, counts what comes until `end` (or `last` messages), and tells.
class Listener {
 public:
  Listener(const std::string& endpoint, zmq::socket_type type, std::int64_t last, bool reads = true) {
    if (::pipe(pipe_.data()) != 0) std::abort();
    child_ = ::fork();
    if (child_ == 0) ::_exit(listen(endpoint, type, last, reads));
    ::close(pipe_[1]);
  }
  ~Listener() {
    ::kill(child_, SIGKILL);
    ::waitpid(child_, nullptr, 0);
    ::close(pipe_[0]);
  }
  Tally tally() {
    Tally t;
    if (::read(pipe_[0], &t, sizeof(t)) != sizeof(t)) std::puts("a subscriber has died");
    return t;
  }

 private:
  int listen(const std::string& endpoint, zmq::socket_type type, std::int64_t last, bool reads) {
    zmq::context_t context;
    zmq::socket_t socket(context, type);
    socket.set(zmq::sockopt::rcvhwm, 200);
    if (type == zmq::socket_type::sub) socket.set(zmq::sockopt::subscribe, "");
    socket.connect(endpoint);
    while (!reads) ::pause();
    Tally t;
    zmq::message_t head, body;
    for (bool ended = false; !ended;) {
      if (!socket.recv(head) || !socket.recv(body)) return 1;
      if (head.to_string_view().starts_with("samples")) ++t.messages, t.bytes += static_cast<std::int64_t>(body.size());
      ended = head.to_string_view().starts_with("end") || t.messages == last;
    }
    return ::write(pipe_[1], &t, sizeof(t)) == sizeof(t) ? 0 : 1;
  }
  std::array<int, 2> pipe_{};
  pid_t child_ = 0;
};

RunInfo feed_info() {
  RunInfo info;
  info.trace_period_s = 1e-6, info.duration_s = 1e9;  // no end in sight: the store is as large as it gets
  for (std::size_t c = 0; c < columns; ++c)
    info.measured.push_back({std::string(1, static_cast<char>('a' + c)), "", ""});
  return info;
}

struct Feed {
  StreamPublisher& to;
  std::int64_t next = 0;
  std::array<double, columns> values{};
  void rows(std::int64_t count) {
    for (std::int64_t i = 0; i < count; ++i) {
      for (double& v : values) v += 1.0;
      to.trace_row({next++, nullptr, values, {}});
    }
  }
};

// ROWS at 1e6 a second, in portions of a millisecond.
void nothing_lost(std::int64_t rows) {
  StreamPublisher publisher(parse_endpoint("*"), {});
  Listener listener(publisher.endpoint(), zmq::socket_type::sub, -1);
  publisher.wait_for(1, [] { return true; });
  publisher.begin(feed_info());
  Feed feed{publisher};
  const auto begun = Clock::now();
  double working_s = 0.0;
  for (std::int64_t ms = 0; ms < rows / 1000; ++ms) {
    std::this_thread::sleep_until(begun + std::chrono::milliseconds(ms));
    const auto from = Clock::now();
    feed.rows(1000);
    working_s += since(from);
  }
  const double took = since(begun);
  publisher.end();
  const StreamFigures figures = publisher.finish("done");
  const Tally t = listener.tally();
  std::printf("%lld rows of %zu at 1e6/s: %.1f s, %.2f GB received, %lld of %lld blocks, %lld dropped, %.1f ns a row\n",
              static_cast<long long>(figures.rows), columns, took, static_cast<double>(t.bytes) * 1e-9,
              static_cast<long long>(t.messages), static_cast<long long>(figures.blocks),
              static_cast<long long>(figures.dropped), working_s / static_cast<double>(rows) * 1e9);
}

constexpr std::int64_t turn_blocks = 4000;  // 0.5 GB a turn

// Fed as fast as it takes rows: the loop stands back while the store is half full, or a subscriber's queue would overflow.
double stream_rate() {
  StreamPublisher publisher(parse_endpoint("*"), {}, {8 << 20, std::size_t{4} << 30});
  Listener listener(publisher.endpoint(), zmq::socket_type::sub, -1);
  publisher.wait_for(1, [] { return true; });
  publisher.begin(feed_info());
  Feed feed{publisher};
  const auto begun = Clock::now();
  for (std::int64_t i = 0; i < turn_blocks; ++i) {
    while (2 * publisher.blocks_waiting() > publisher.blocks_in_store() || publisher.longest_queue() > (16u << 20)) {
      std::this_thread::sleep_for(std::chrono::microseconds(50));
    }
    feed.rows(block_rows);
  }
  publisher.end();
  const StreamFigures figures = publisher.finish("done");
  const Tally t = listener.tally();
  if (figures.dropped > 0 || t.messages != figures.blocks)
    std::printf("lost: %lld\n", static_cast<long long>(figures.dropped));
  return static_cast<double>(t.bytes) / since(begun);
}

// The same frames through a bare pair; `copied`: each from a store of its own, as a sender of data must, or one and the same.
double bare_rate(bool copied) {
  zmq::context_t context;
  zmq::socket_t socket(context, zmq::socket_type::push);
  const std::size_t size = block_rows * columns * sizeof(double) + columns * 5 + 100;
  socket.set(zmq::sockopt::sndhwm, 256);
  socket.bind("tcp://127.0.0.1:*");
  Listener listener(socket.get(zmq::sockopt::last_endpoint), zmq::socket_type::pull, turn_blocks);
  std::vector<char> store(size * 128, 'x');
  const auto begun = Clock::now();
  for (std::size_t i = 0; i < static_cast<std::size_t>(turn_blocks); ++i) {
    socket.send(zmq::str_buffer("samples/11"), zmq::send_flags::sndmore);
    if (copied) {
      socket.send(zmq::buffer(store.data() + i % 128 * size, size));
    } else {
      socket.send(zmq::message_t(store.data(), size, [](void*, void*) {}), zmq::send_flags::none);
    }
  }
  const Tally t = listener.tally();
  return static_cast<double>(t.bytes) / since(begun);
}

// Ratios turn by turn, since neighbours of a shared machine come and go.
void throughput() {
  std::vector<double> stream, copied, same, of_copied, of_same;
  for (int turn = 0; turn < 25; ++turn) {
    stream.push_back(stream_rate());
    copied.push_back(bare_rate(true));
    same.push_back(bare_rate(false));
    of_copied.push_back(stream.back() / copied.back());
    of_same.push_back(stream.back() / same.back());
  }
  std::printf("stream, unpaced:          %.2f GB/s\n", median(stream) * 1e-9);
  std::printf("bare pair, bytes copied:  %.2f GB/s   of_bare %.2f\n", median(copied) * 1e-9, median(of_copied));
  std::printf("bare pair, one buffer:    %.2f GB/s   of_bare %.2f\n", median(same) * 1e-9, median(of_same));
}

double resident_MiB() {
  std::ifstream status("/proc/self/status");
  for (std::string line; std::getline(status, line);) {
    if (line.starts_with("VmRSS:")) return std::strtod(line.c_str() + 6, nullptr) / 1024.0;
  }
  return 0.0;
}

struct Cost {
  double wall_s, thread_s, resident;
};

Cost one_run(const Scenario& s, StreamPublisher* publisher) {
  const auto thread_s = [] {
    timespec t{};
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
    return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
  };
  const ScoreBasis basis = score_basis(s);
  EstimatorScore estimators(basis);
  DriveScore drive(basis);
  ColumnMeans means(basis.window);
  RunDigest digest;
  std::vector<RunObserver*> observers = {&estimators, &drive, &means, &digest};  // as `slipbench run` has them
  if (publisher != nullptr) observers.push_back(publisher);
  const double before = thread_s();
  const RunOutcome outcome = simulate(s, observers);
  return {outcome.wall_s, thread_s() - before, resident_MiB()};
}

// A row each plant step: the dearest case there is.
void cost_to_run() {
  Scenario s = read_scenario(SLIPBENCH_SOURCE_DIR "/configs/scenarios/mains_start.toml",
                             {{"run.trace_period_s", "20e-6"}, {"run.duration_s", "10.0"}}, {});
  enum Kind { alone, listened, stopped, nobody };
  const char* names[] = {"alone", "one subscriber", "one that has stopped", "no subscriber"};
  std::array<std::vector<double>, 4> wall, of_alone, thread;
  double alone_s = 0.0;
  std::array<double, 4> resident{};
  std::int64_t dropped = 0;
  for (int turn = 0; turn < 11; ++turn) {
    for (const Kind kind : {alone, listened, stopped, nobody}) {
      Cost cost{};
      if (kind == alone) {
        cost = one_run(s, nullptr);
      } else {
        StreamPublisher publisher(parse_endpoint("*"), {});
        std::unique_ptr<Listener> listener;
        if (kind != nobody) {
          listener = std::make_unique<Listener>(publisher.endpoint(), zmq::socket_type::sub, -1, kind == listened);
          publisher.wait_for(1, [] { return true; });
        }
        cost = one_run(s, &publisher);
        const StreamFigures figures = publisher.finish("done");
        if (kind == listened) dropped += figures.dropped;
      }
      if (kind == alone) alone_s = cost.wall_s;
      wall[kind].push_back(cost.wall_s), of_alone[kind].push_back(cost.wall_s / alone_s);
      thread[kind].push_back(cost.thread_s);
      resident[kind] = std::max(resident[kind], cost.resident);
    }
  }
  std::printf("a mains start, 10 s, 500001 rows of 42 columns:\n");
  for (const Kind kind : {alone, listened, stopped, nobody}) {
    std::printf("  %-21s %.3f s wall, of_alone %.3f; %.3f s of its core, of_alone %.3f; at most %.0f MiB\n",
                names[kind], median(wall[kind]), median(of_alone[kind]), median(thread[kind]),
                median(thread[kind]) / median(thread[alone]), resident[kind]);
  }
  std::printf("  dropped for the one that reads: %lld blocks\n", static_cast<long long>(dropped));
}

}  // namespace

int main(int count, char** words) {
  const double rows = count > 1 ? std::strtod(words[1], nullptr) : 1e8;
  if (!(rows >= 1000.0)) {
    std::puts("usage: bench_stream [ROWS], 1000 at least");
    return 2;
  }
  std::setvbuf(stdout, nullptr, _IOLBF, 0);
  throughput();
  cost_to_run();
  nothing_lost(static_cast<std::int64_t>(rows));
}
