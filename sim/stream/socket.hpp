// The socket that a stream is published on: who has subscribed to what, and one bounded queue for each of them.
//
// Each connection is served by itself: it is subscribed, here, to the topics `samples/N`, N being its own number, and gets
// its own copy of the message's head; the body is shared. So one full queue loses what is meant for it, and every loss is
// seen and counted. (With one topic for all, libzmq 4.3 tells of the first message that a full queue loses, and then leaves
// that subscriber out without a word until it has drained by half.) A queue's length in bytes is known exactly: libzmq
// lets go of a body when it has been handed to the kernel. All calls from one thread at a time.
#pragma once

#include <array>
#include <atomic>
#include <chrono>
#include <map>
#include <string_view>
#include <zmq.hpp>

#include "sim/stream/endpoint.hpp"
#include "sim/stream/messages.hpp"

namespace slipbench {

enum class Topic : std::size_t { describe, samples, end };
inline constexpr std::array<std::string_view, 3> topic_names = {"describe", "samples", "end"};

struct Subscriber {
  std::array<int, topic_names.size()> subscriptions{};  // that cover each topic
  std::atomic<std::size_t> queued_bytes{0};
  bool described = false;
  bool started = false;         // it was given its first block
  std::int64_t missed = 0;      // blocks since its first
  std::size_t seen_queued = 0;  // by flush(), and since when it is so
  std::chrono::steady_clock::time_point moved;

  void miss(std::int64_t blocks) {
    if (started) missed += blocks;
  }
  void forget() { started = false, missed = 0; }
  [[nodiscard]] bool wants(Topic topic) const { return subscriptions[static_cast<std::size_t>(topic)] > 0; }
};

class StreamSocket {
 public:
  // Binds; OutsideError names the endpoint and why. `queue_bytes`: of one subscriber at most; four times that for all.
  StreamSocket(const Endpoint& endpoint, std::size_t queue_bytes);
  ~StreamSocket() { close(std::chrono::milliseconds(0)); }

  void take_subscriptions();                    // those that have come meanwhile
  void wait(std::chrono::milliseconds atmost);  // until one comes
  // Queues a body for one subscriber, without ever waiting. A block that finds no room is counted in `missed`: false.
  bool send(int number, Subscriber& to, Topic topic, Message& message);
  // Waits until all queues are empty: 2 s at most, and for one who has missed blocks only while it moves: 0.2 s.
  void flush();
  void close(std::chrono::milliseconds linger);

  [[nodiscard]] std::map<int, Subscriber>& subscribers() { return subscribers_; }
  [[nodiscard]] const std::string& endpoint() const { return bound_; }
  [[nodiscard]] std::int64_t present() const { return present_; }  // subscriptions that cover `samples`
  [[nodiscard]] std::int64_t most_present() const { return most_present_; }
  [[nodiscard]] std::size_t longest_queue() const;  // bytes
  [[nodiscard]] MessageStore& store() { return store_; }

 private:
  void subscription(bool begins, std::string_view prefix, int number);

  std::size_t queue_bytes_;
  std::int64_t present_ = 0, most_present_ = 0, all_subscriptions_ = 0;
  MessageStore store_;                     // outlives the context, which holds bodies
  std::map<int, Subscriber> subscribers_;  // by number; likewise
  zmq::context_t context_{1};
  zmq::socket_t socket_;
  std::string bound_, path_;
};

}  // namespace slipbench
