// The bodies of the stream's messages, as MessagePack maps, and the store of buffers that they are written into.
#pragma once

#include <atomic>
#include <cstdint>
#include <memory>
#include <string>
#include <vector>

#include "sim/engine/columns.hpp"
#include "sim/stream/block_ring.hpp"

namespace slipbench {

inline constexpr int stream_protocol_version = 1;

// What `describe` says.
struct StreamDescription {
  std::string version, run, scenario;  // of the program; 16 hexadecimal digits; its title
  std::uint64_t seed = 0;
  double period_s = 0.0, duration_s = 0.0;
  std::vector<Column> columns;
};

// What `end` says.
struct StreamEnd {
  std::string run, status;  // done | diverged | interrupted
  std::int64_t blocks = 0, rows = 0, dropped = 0, missed = 0;
};

// One body. Several queues may hold it at once; it is free again when none does.
struct Message {
  std::unique_ptr<char[]> bytes;
  std::size_t capacity = 0, size = 0;
  bool samples = false, dropped = false;  // `dropped`: known not to reach some subscriber, and counted
  std::atomic<int> holders{0};
};

// Buffers used again and again. The first free one is taken, so that few are touched, and those often, while all goes well.
class MessageStore {
 public:
  Message& take(std::size_t size);  // with one holder, the caller, who lets go with release()
  static void release(Message& message) { message.holders.fetch_sub(1, std::memory_order_release); }

  [[nodiscard]] std::int64_t samples_held() const;  // blocks still in a queue that are not counted as dropped
  [[nodiscard]] std::size_t bytes() const { return bytes_; }

 private:
  std::vector<std::unique_ptr<Message>> messages_;
  std::size_t bytes_ = 0;
};

Message& describe_message(MessageStore& store, const StreamDescription& description);
Message& samples_message(MessageStore& store, const StreamDescription& description, const Block& block,
                         std::size_t stride);
Message& end_message(MessageStore& store, const StreamEnd& end);

}  // namespace slipbench
