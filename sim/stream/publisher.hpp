// The observer that publishes a run as it happens. The run never waits for it: trace_row puts a row into a block of a fixed
// store and, when that is full or a tenth of a second old, hands it to a thread that encodes and sends. When all blocks
// are in use the newest is dropped and counted. trace_row allocates nothing, takes no lock, reads no clock (the sending
// thread says when a tenth of a second is over) and makes no system call.
#pragma once

#include <functional>
#include <memory>
#include <thread>

#include "sim/engine/observer.hpp"
#include "sim/stream/figures.hpp"
#include "sim/stream/socket.hpp"

namespace slipbench {

struct StreamLabel {
  std::string version, scenario;  // of the program; the scenario's title, or its file's name
  std::uint64_t seed = 0;
};

struct StreamLimits {
  std::size_t store_bytes = 64 << 20;  // blocks not sent yet
  std::size_t queue_bytes = 64 << 20;  // of one subscriber; all together hold at most four times this
};

class StreamPublisher : public RunObserver {
 public:
  // Binds; OutsideError when that fails.
  StreamPublisher(const Endpoint& endpoint, StreamLabel label, StreamLimits limits = {});
  ~StreamPublisher() override;
  StreamPublisher(const StreamPublisher&) = delete;
  StreamPublisher& operator=(const StreamPublisher&) = delete;

  [[nodiscard]] const std::string& endpoint() const { return socket_.endpoint(); }  // as bound: the port is known
  // Before the run: until so many have subscribed, or `go_on`, asked every 50 ms, says no.
  void wait_for(std::int64_t subscribers, const std::function<bool()>& go_on);

  void begin(const RunInfo& info) override;
  void control_tick(const TickView&) override {
    if (rows_ > 0 && hand_over_.load(std::memory_order_relaxed)) close_block();
  }
  void trace_row(const RowView& row) override;
  void end() override;

  // After the run: sends what is left and `end`. done | diverged | interrupted. OutsideError if the sending thread failed.
  StreamFigures finish(const std::string& status);

  [[nodiscard]] std::size_t blocks_in_store() const { return ring_ ? ring_->blocks() : 0; }
  [[nodiscard]] std::size_t blocks_waiting() const { return ring_ ? ring_->in_use() : 0; }
  // From any thread, a moment old: bytes of all buffers, and in the longest queue of a subscriber.
  [[nodiscard]] std::size_t bytes() const { return (ring_ ? ring_->bytes() : 0) + buffer_bytes_.load(); }
  [[nodiscard]] std::size_t longest_queue() const { return longest_queue_.load(); }

 private:
  void close_block();
  void serve();
  void describe(bool to_all);
  void publish(const Block& block);
  void say_end();
  void stop();

  StreamLimits limits_;
  StreamDescription description_;
  StreamSocket socket_;
  std::unique_ptr<BlockRing> ring_;
  std::thread sender_;

  // The run's thread.
  std::size_t plant_columns_ = 0, rows_per_block_ = 0, stride_ = 0, rows_ = 0;
  Block* block_ = nullptr;
  std::int64_t sequence_ = 0, next_row_ = 0;

  // Both.
  std::atomic<bool> hand_over_{false};  // by the sender: a tenth of a second is over
  std::atomic<bool> over_{false};       // by the run: nothing follows
  std::string status_ = "interrupted";
  std::atomic<std::size_t> buffer_bytes_{0}, longest_queue_{0};

  // The sending thread.
  std::int64_t expected_ = 0, dropped_ = 0;  // the next block's sequence
  std::string failure_;
};

}  // namespace slipbench
