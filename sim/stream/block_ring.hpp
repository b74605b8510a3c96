// A fixed store of blocks of rows, filled by one thread and read by one other, in order, without lock or allocation.
//
// A block is column-wise: value k of column c stands at values[c * stride + k]. The stride is one cache line longer than
// the rows, so that the columns of a row do not all fall into one set of the cache.
#pragma once

#include <atomic>
#include <cstdint>
#include <vector>

namespace slipbench {

struct Block {
  double* values = nullptr;
  std::size_t rows = 0;
  std::int64_t sequence = 0, first_row = 0;
};

class BlockRing {
 public:
  // Touches all of its memory: no page is left for the first row that needs it.
  BlockRing(std::size_t columns, std::size_t rows, std::size_t blocks)
      : stride_(rows + 8), values_(columns * stride_ * blocks), blocks_(blocks) {
    for (std::size_t i = 0; i < blocks; ++i) blocks_[i].values = values_.data() + i * columns * stride_;
  }

  // The filling thread: the next block to fill, nullptr while all are in use; close() hands it over.
  Block* open() {
    const std::size_t head = head_.load(std::memory_order_relaxed);
    if (head - tail_.load(std::memory_order_acquire) == blocks_.size()) return nullptr;
    return &blocks_[head % blocks_.size()];
  }
  void close() { head_.store(head_.load(std::memory_order_relaxed) + 1, std::memory_order_release); }

  // The reading thread: the oldest block handed over, nullptr when there is none; pop() gives it back.
  const Block* front() const {
    const std::size_t tail = tail_.load(std::memory_order_relaxed);
    if (tail == head_.load(std::memory_order_acquire)) return nullptr;
    return &blocks_[tail % blocks_.size()];
  }
  void pop() { tail_.store(tail_.load(std::memory_order_relaxed) + 1, std::memory_order_release); }

  [[nodiscard]] std::size_t stride() const { return stride_; }
  [[nodiscard]] std::size_t blocks() const { return blocks_.size(); }
  [[nodiscard]] std::size_t in_use() const {  // from any thread, a moment's view
    const std::size_t tail = tail_.load(std::memory_order_acquire);
    return head_.load(std::memory_order_acquire) - tail;
  }
  [[nodiscard]] std::size_t bytes() const { return values_.size() * sizeof(double); }

 private:
  std::size_t stride_;
  std::vector<double> values_;
  std::vector<Block> blocks_;
  alignas(64) std::atomic<std::size_t> head_{0};  // blocks ever handed over
  alignas(64) std::atomic<std::size_t> tail_{0};  // blocks ever given back
};

}  // namespace slipbench
