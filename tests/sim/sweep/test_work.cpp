// Work in pieces: order, turns, what pieces add, how it ends.
#include <atomic>
#include <catch2/catch.hpp>
#include <stdexcept>
#include <string>
#include <thread>
#include <vector>

#include "sim/sweep/work.hpp"

using slipbench::Work;

TEST_CASE("work: what was begun goes before what is new, and pieces take turns", "[sweep]") {
  Work work;
  std::string order;
  const auto piece = [&order](char name, int turns) {
    return [&order, name, turns](std::size_t) mutable {
      order += name;
      return --turns > 0;
    };
  };
  work.add_new(piece('n', 1));
  work.add(piece('a', 3));
  work.add(piece('b', 2));
  work.finish();
  while (work.run_one(0)) {
  }
  CHECK(order == "ababan");
}

TEST_CASE("work: threads wait for what a running piece may add, and all of it is run once", "[sweep]") {
  Work work;
  std::atomic<int> ran{0};
  constexpr int units = 20, pieces = 50, turns = 3;
  for (int u = 0; u < units; ++u) {
    work.add_new([&](std::size_t) {
      for (int p = 0; p < pieces; ++p)
        work.add([&ran, left = turns](std::size_t) mutable {
          ++ran;
          return --left > 0;
        });
      return false;
    });
  }
  work.finish();
  std::vector<std::thread> crew;
  for (std::size_t t = 0; t < 4; ++t)
    crew.emplace_back([&work, t] {
      while (work.run_one(t)) {
      }
    });
  for (std::thread& one : crew) one.join();
  CHECK(ran == units * pieces * turns);
}

TEST_CASE("work: closed, nothing that waits is run; what a piece throws comes out", "[sweep]") {
  Work work;
  int ran = 0;
  work.add([&](std::size_t) -> bool { throw std::runtime_error("broken"); });
  work.add([&](std::size_t) {
    ++ran;
    work.close();
    return true;
  });
  work.add([&](std::size_t) { return ++ran > 0; });
  CHECK_THROWS_WITH(work.run_one(0), "broken");
  CHECK(work.run_one(0));
  CHECK_FALSE(work.run_one(0));
  work.add([&](std::size_t) { return ++ran > 0; });
  CHECK_FALSE(work.run_one(0));
  CHECK(ran == 1);
}
