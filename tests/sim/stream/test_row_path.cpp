// The run's side of the stream, trace_row and control_tick: no allocation, and no system call, so neither a lock that waits nor a
// sleep nor a look at a file.
#if !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)
#include <linux/seccomp.h>
#include <signal.h>
#include <sys/prctl.h>
#include <sys/syscall.h>
#include <sys/wait.h>
#include <unistd.h>
#include <catch2/catch.hpp>

#include <cstdlib>
#include <functional>
#include <new>

#include "tests/sim/stream/client.hpp"

namespace {
thread_local std::int64_t allocations = 0;  // of this thread: the sending one may allocate
}

[[gnu::noinline]] void* operator new(std::size_t size) {
  ++allocations;
  if (void* p = std::malloc(size == 0 ? 1 : size)) return p;
  throw std::bad_alloc();
}
[[gnu::noinline]] void operator delete(void* p) noexcept { std::free(p); }
[[gnu::noinline]] void operator delete(void* p, std::size_t) noexcept { std::free(p); }

using namespace slipbench;
using slipbench::test::Client;
using slipbench::test::Feed;
using slipbench::test::feed_info;

namespace {

// In a process of its own, after `prepare`: the kernel kills it at its first system call but read, write and exit
// (seccomp(2), strict mode). Whether `work` got through; none where the kernel does not offer that mode.
std::optional<bool> without_system_calls(const std::function<std::function<void()>()>& prepare) {
  int pipe_ends[2];
  REQUIRE(::pipe(pipe_ends) == 0);
  const pid_t child = ::fork();
  REQUIRE(child >= 0);
  if (child == 0) {
    const std::function<void()> work = prepare();
    if (::prctl(PR_SET_SECCOMP, SECCOMP_MODE_STRICT) != 0) {
      if (::write(pipe_ends[1], "?", 1) < 0) ::_exit(1);
      ::_exit(0);
    }
    work();
    if (::write(pipe_ends[1], "y", 1) < 0) ::syscall(SYS_exit, 1);
    ::syscall(SYS_exit, 0);
  }
  ::close(pipe_ends[1]);
  char answer = 'n';
  if (::read(pipe_ends[0], &answer, 1) != 1) answer = 'n';
  ::close(pipe_ends[0]);
  ::kill(child, SIGKILL);  // its other threads go on
  ::waitpid(child, nullptr, 0);
  if (answer == '?') return {};
  return answer == 'y';
}

}  // namespace

TEST_CASE("stream: a row allocates nothing, sent or dropped", "[stream][property]") {
  const std::size_t store = GENERATE(std::size_t{64} << 20, std::size_t{1} << 18);
  StreamPublisher publisher(parse_endpoint("*"), {}, {store, 1 << 20});
  const Client stopped(publisher.endpoint());  // subscribes and never reads
  publisher.wait_for(1, [] { return true; });
  CHECK(allocations > 0);  // set-up does, and is seen to
  publisher.begin(feed_info(1.0));
  Feed feed(publisher);
  feed.row();
  const std::int64_t before = allocations;
  for (int i = 0; i < 300000; ++i) {
    feed.row();
    publisher.control_tick({});
  }
  CHECK(allocations == before);
  publisher.end();
  CHECK(publisher.finish("done").dropped > 0);
}

TEST_CASE("stream: a row makes no system call, sent or dropped", "[stream][property]") {
  const auto feeding = [](std::size_t store) {
    return without_system_calls([store] {
      auto* publisher = new StreamPublisher(parse_endpoint("*"), {}, {store, 1 << 20});
      new Client(publisher->endpoint());  // subscribes and never reads
      publisher->wait_for(1, [] { return true; });
      publisher->begin(feed_info(1.0));
      return [publisher] {
        Feed feed(*publisher);
        for (int i = 0; i < 300000; ++i) {
          feed.row();
          publisher->control_tick({});
        }
      };
    });
  };
  const auto asking = without_system_calls([] { return [] { ::getppid(); }; });
  if (!asking) {
    WARN("this kernel offers no strict seccomp mode: not checked here");
    return;
  }
  CHECK_FALSE(*asking);  // the trap does catch
  CHECK(feeding(64 << 20) == true);
  CHECK(feeding(1 << 18) == true);
}

#endif
