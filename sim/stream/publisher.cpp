#include "sim/stream/publisher.hpp"

#include <algorithm>
#include <cmath>
#include <csignal>
#include <random>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

using Clock = std::chrono::steady_clock;
using std::chrono::milliseconds;

constexpr std::size_t longest_block = 1024;       // rows
constexpr std::size_t largest_block = 256 << 10;  // bytes: what a core's cache holds while it is copied
constexpr milliseconds oldest_block(100), describe_every(1000);

std::string random_run() {
  constexpr std::string_view digits = "0123456789abcdef";
  std::random_device device;
  std::string text;
  for (int i = 0; i < 16; ++i) text += digits[device() % 16];
  return text;
}

// Signals are for the run's thread.
std::thread thread_without_signals(const std::function<void()>& work) {
  sigset_t all, before;
  sigfillset(&all);
  pthread_sigmask(SIG_SETMASK, &all, &before);
  std::thread thread(work);
  pthread_sigmask(SIG_SETMASK, &before, nullptr);
  return thread;
}

}  // namespace

StreamPublisher::StreamPublisher(const Endpoint& endpoint, StreamLabel label, StreamLimits limits)
    : limits_(limits), socket_(endpoint, limits.queue_bytes) {
  description_.version = std::move(label.version);
  description_.run = random_run();
  description_.scenario = std::move(label.scenario);
  description_.seed = label.seed;
}

StreamPublisher::~StreamPublisher() { stop(); }

void StreamPublisher::wait_for(std::int64_t subscribers, const std::function<bool()>& go_on) {
  for (socket_.take_subscriptions(); socket_.present() < subscribers && go_on(); socket_.take_subscriptions()) {
    socket_.wait(milliseconds(50));
  }
}

void StreamPublisher::begin(const RunInfo& info) {
  description_.period_s = info.trace_period_s;
  description_.duration_s = info.duration_s;
  const std::vector<Column>& columns = description_.columns = info.columns();
  plant_columns_ = info.plant.size();
  const std::size_t row_bytes = columns.size() * sizeof(double);
  rows_per_block_ = std::clamp(largest_block / row_bytes / 8 * 8, std::size_t{8}, longest_block);
  // A short run needs less than the store may have: blocks for all of its rows, and some that are handed over early.
  const double all_rows = info.duration_s / info.trace_period_s;
  const double blocks = std::min(all_rows / static_cast<double>(rows_per_block_) + 32.0,
                                 static_cast<double>(limits_.store_bytes / (row_bytes * (rows_per_block_ + 8))));
  ring_ = std::make_unique<BlockRing>(columns.size(), rows_per_block_, static_cast<std::size_t>(std::max(blocks, 2.0)));
  stride_ = ring_->stride();
  sender_ = thread_without_signals([this] {
    try {
      serve();
    } catch (const std::exception& error) {
      failure_ = error.what();
    }
  });
}

void StreamPublisher::trace_row(const RowView& row) {
  if (rows_ == 0) block_ = ring_->open();
  if (block_ != nullptr) {
    double* at = block_->values + rows_;
    const auto put = [&](const double* values, std::size_t count) {
      for (std::size_t i = 0; i < count; ++i, at += stride_) *at = values[i];
    };
    if (plant_columns_ > 0) put(row.plant->data(), plant_columns_);
    put(row.measured.data(), row.measured.size());
    put(row.estimates.data(), row.estimates.size());
  }
  if (++rows_ == rows_per_block_ || hand_over_.load(std::memory_order_relaxed)) close_block();
}

void StreamPublisher::close_block() {
  hand_over_.store(false, std::memory_order_relaxed);
  if (block_ != nullptr) {
    block_->rows = rows_;
    block_->sequence = sequence_;
    block_->first_row = next_row_;
    ring_->close();
  }
  ++sequence_;  // also of a block that is dropped: the gap tells of it
  next_row_ += static_cast<std::int64_t>(rows_);
  rows_ = 0;
}

void StreamPublisher::end() {
  if (rows_ > 0) close_block();
}

StreamFigures StreamPublisher::finish(const std::string& status) {
  status_ = status;
  stop();
  if (!failure_.empty()) throw OutsideError("publishing on " + endpoint() + " failed under way: " + failure_);
  return {endpoint(), socket_.most_present(), sequence_, next_row_, dropped_};
}

void StreamPublisher::stop() {
  over_.store(true, std::memory_order_release);
  if (sender_.joinable()) sender_.join();
  socket_.close(milliseconds(0));
}

void StreamPublisher::serve() {
  auto next_describe = Clock::now(), last_block = next_describe;
  for (;;) {
    const bool over = over_.load(std::memory_order_acquire);  // asked first: an empty ring then stays empty
    const auto now = Clock::now();
    socket_.take_subscriptions();
    const bool again = now >= next_describe;
    if (again) next_describe = now + describe_every;
    describe(again);
    longest_queue_.store(socket_.longest_queue(), std::memory_order_relaxed);
    if (const Block* block = ring_->front()) {
      publish(*block);
      ring_->pop();
      last_block = now;
      continue;
    }
    if (over) break;
    if (now - last_block >= oldest_block) {
      hand_over_.store(true, std::memory_order_relaxed);
      last_block = now;
    }
    socket_.wait(milliseconds(1));  // the run wakes nobody: that would be a system call
  }
  say_end();
}

void StreamPublisher::describe(bool to_all) {
  Message* message = nullptr;
  for (auto& [number, subscriber] : socket_.subscribers()) {
    if (subscriber.described && !to_all) continue;
    if (message == nullptr) message = &describe_message(socket_.store(), description_);
    if (socket_.send(number, subscriber, Topic::describe, *message)) subscriber.described = true;
  }
  if (message != nullptr) MessageStore::release(*message);
}

void StreamPublisher::publish(const Block& block) {
  const std::int64_t lost = block.sequence - expected_;  // for want of a free block
  expected_ = block.sequence + 1;
  dropped_ += lost;
  Message& message = samples_message(socket_.store(), description_, block, stride_);
  for (auto& [number, subscriber] : socket_.subscribers()) {
    subscriber.miss(lost);
    if (!socket_.send(number, subscriber, Topic::samples, message)) message.dropped = true;
  }
  dropped_ += message.dropped;
  MessageStore::release(message);
  buffer_bytes_.store(socket_.store().bytes(), std::memory_order_relaxed);
}

void StreamPublisher::say_end() {
  const std::int64_t lost = sequence_ - expected_;
  dropped_ += lost;
  for (auto& [number, subscriber] : socket_.subscribers()) {
    subscriber.miss(lost);
    const StreamEnd end{description_.run, status_, sequence_, next_row_, dropped_, subscriber.missed};
    Message& message = end_message(socket_.store(), end);
    socket_.send(number, subscriber, Topic::end, message);
    MessageStore::release(message);
  }
  socket_.flush();
  const std::int64_t left = socket_.store().samples_held();  // in the queue of one who has stopped
  dropped_ += left;
  socket_.close(milliseconds(left > 0 ? 100 : 500));
}

}  // namespace slipbench
