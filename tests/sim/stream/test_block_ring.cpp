// The store between the run's thread and the sending one: order, contents, and what happens when it is full. Also for the
// thread sanitizer, which sees whether a block's values are handed over as they should be.
#include <catch2/catch.hpp>

#include <thread>

#include "sim/stream/block_ring.hpp"

using namespace slipbench;

TEST_CASE("block ring: full means none, and a block given back serves again", "[stream][property]") {
  BlockRing ring(2, 8, 3);
  CHECK(ring.front() == nullptr);
  for (int i = 0; i < 3; ++i) {
    Block* block = ring.open();
    REQUIRE(block != nullptr);
    CHECK(ring.open() == block);  // until it is closed
    block->sequence = i;
    ring.close();
  }
  CHECK(ring.open() == nullptr);
  CHECK(ring.in_use() == 3);
  CHECK(ring.front()->sequence == 0);
  ring.pop();
  CHECK(ring.open() != nullptr);
  CHECK(ring.front()->sequence == 1);
  CHECK(ring.in_use() == 2);
}

TEST_CASE("block ring: what one thread fills, another reads whole and in order", "[stream][property]") {
  constexpr std::size_t columns = 3, rows = 64;
  constexpr std::int64_t blocks = 20000;
  BlockRing ring(columns, rows, 4);
  std::int64_t dropped = 0, filled = 0;
  std::atomic<bool> over{false};
  std::thread writer([&] {
    for (std::int64_t n = 0; n < blocks; ++n) {
      Block* block = ring.open();
      if (block == nullptr) {
        ++dropped;
        std::this_thread::yield();
        continue;
      }
      block->sequence = n, block->rows = rows;
      for (std::size_t c = 0; c < columns; ++c) {
        for (std::size_t k = 0; k < rows; ++k) block->values[c * ring.stride() + k] = static_cast<double>(n);
      }
      ring.close();
      ++filled;
    }
    over.store(true);
  });
  std::int64_t last = -1, read = 0, wrong = 0;
  for (;;) {
    const bool done = over.load();  // asked first: an empty ring then stays empty
    const Block* block = ring.front();
    if (block == nullptr) {
      if (done) break;
      std::this_thread::yield();
      continue;
    }
    wrong += block->sequence <= last || block->rows != rows;
    for (std::size_t c = 0; c < columns; ++c) {
      for (std::size_t k = 0; k < rows; ++k) {
        wrong += block->values[c * ring.stride() + k] != static_cast<double>(block->sequence);
      }
    }
    last = block->sequence, ++read;
    ring.pop();
  }
  writer.join();
  CHECK(wrong == 0);
  CHECK(read == filled);
  CHECK(filled + dropped == blocks);
  CHECK(filled > 0);
}
