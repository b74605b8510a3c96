// A subscriber written from the protocol's page alone, on a ZeroMQ SUB socket; and rows whose every value tells where it belongs.
#pragma once

#include <atomic>
#include <cstring>
#include <functional>
#include <map>
#include <msgpack.hpp>
#include <optional>
#include <string>
#include <thread>
#include <vector>
#include <zmq.hpp>

#include "sim/stream/publisher.hpp"

namespace slipbench::test {

struct Received {
  std::string topic;
  zmq::message_t body;
  std::map<std::string, msgpack::object> map;  // into `zone`
  msgpack::object_handle zone;

  template <class Value>
  Value at(const std::string& key) const {
    return map.at(key).as<Value>();
  }
  [[nodiscard]] std::vector<double> column(std::size_t index) const {
    const msgpack::object& bytes = map.at("columns").via.array.ptr[index];
    if (bytes.type != msgpack::type::BIN || bytes.via.bin.size != at<std::size_t>("rows") * sizeof(double)) {
      throw std::runtime_error("a column of another type or length");
    }
    std::vector<double> values(at<std::size_t>("rows"));
    std::memcpy(values.data(), bytes.via.bin.ptr, bytes.via.bin.size);
    return values;
  }
  [[nodiscard]] std::size_t columns() const { return map.at("columns").via.array.size; }
};

class Client {
 public:
  explicit Client(const std::string& endpoint, const std::vector<std::string>& subscriptions = {""}) {
    socket_.set(zmq::sockopt::linger, 0);
    socket_.set(zmq::sockopt::rcvhwm, 4);  // little is held on this side, so that a stop is felt on the other
    for (const std::string& s : subscriptions) socket_.set(zmq::sockopt::subscribe, s);
    socket_.connect(endpoint);
  }
  // Nothing within the time: none.
  std::optional<Received> next(int atmost_ms = 10000) {
    socket_.set(zmq::sockopt::rcvtimeo, atmost_ms);
    zmq::message_t head;
    if (!socket_.recv(head)) return {};
    Received r;
    if (!head.more() || !socket_.recv(r.body) || r.body.more()) throw std::runtime_error("not two frames");
    const std::string topic = head.to_string();
    r.topic = topic.substr(0, topic.find('/'));
    r.zone = msgpack::unpack(static_cast<const char*>(r.body.data()), r.body.size());
    r.map = r.zone.get().as<std::map<std::string, msgpack::object>>();
    return r;
  }

 private:
  zmq::context_t context_;
  zmq::socket_t socket_{context_, zmq::socket_type::sub};
};

// 16 columns, of which value (row, column) is 16 row + column: exact in a double far past any test's length.
inline constexpr std::size_t feed_columns = 16;
inline RunInfo feed_info(double duration_s) {
  RunInfo info;
  info.trace_period_s = 1e-6;
  info.duration_s = duration_s;
  for (std::size_t c = 0; c < feed_columns; ++c)
    info.measured.push_back({std::string(1, static_cast<char>('a' + c)), "", "counts"});
  return info;
}

class Feed {
 public:
  explicit Feed(RunObserver& to) : to_(to) {}
  void row() {
    for (std::size_t c = 0; c < feed_columns; ++c) values_[c] = static_cast<double>(16 * next_ + static_cast<int>(c));
    to_.trace_row({next_++, nullptr, values_, {}});
  }
  void rows(std::int64_t count) {
    for (std::int64_t i = 0; i < count; ++i) row();
  }

 private:
  RunObserver& to_;
  std::int64_t next_ = 0;
  std::array<double, feed_columns> values_{};
};

// What one client makes of a whole stream of Feed's rows, every value looked at.
struct Account {
  std::int64_t blocks = 0, rows = 0, gaps = 0, next_sequence = 0, next_row = 0, wrong = 0;
  bool described_first = false;
  std::string status;
  std::int64_t end_blocks = 0, end_rows = 0, dropped = 0, missed = 0;

  void take(const Received& r) {
    if (r.topic == "describe") described_first |= blocks == 0;
    if (r.topic == "samples") {
      const auto sequence = r.at<std::int64_t>("sequence"), first = r.at<std::int64_t>("first_tick");
      gaps += sequence - next_sequence;
      wrong += sequence == next_sequence && first != next_row;
      for (std::size_t c = 0; c < r.columns(); ++c) {
        const std::vector<double> values = r.column(c);
        for (std::size_t k = 0; k < values.size(); ++k) {
          wrong += values[k] != static_cast<double>(16 * (first + static_cast<std::int64_t>(k)) + static_cast<int>(c));
        }
      }
      ++blocks, rows += r.at<std::int64_t>("rows");
      next_sequence = sequence + 1, next_row = first + r.at<std::int64_t>("rows");
    }
    if (r.topic == "end") {
      status = r.at<std::string>("status");
      end_blocks = r.at<std::int64_t>("blocks"), end_rows = r.at<std::int64_t>("rows");
      dropped = r.at<std::int64_t>("dropped"), missed = r.at<std::int64_t>("missed");
      gaps += end_blocks - next_sequence;
    }
  }
};

// A client that reads on a thread of its own until `end`, or until nothing comes for a while.
class Reader {
 public:
  explicit Reader(const std::string& endpoint) : client_(endpoint) {}
  ~Reader() { join(); }
  void start(int patience_ms = 10000) {
    thread_ = std::thread([this, patience_ms] {
      while (account_.status.empty()) {
        const auto r = client_.next(patience_ms);
        if (!r) return;
        account_.take(*r);
        blocks_.store(account_.blocks);
      }
    });
  }
  [[nodiscard]] std::int64_t blocks() const { return blocks_.load(); }
  const Account& join() {
    if (thread_.joinable()) thread_.join();
    return account_;
  }

 private:
  Client client_;
  Account account_;
  std::atomic<std::int64_t> blocks_{0};
  std::thread thread_;
};

}  // namespace slipbench::test
