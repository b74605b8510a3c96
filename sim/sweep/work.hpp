// Work in pieces for a crew of threads. A piece is run for a while and says whether there is more of it; then it stands at the
// end of the line again, so that all that was begun ends together and no thread waits long for another's last piece. A piece may
// add others. What was begun goes before what is new.
#pragma once

#include <condition_variable>
#include <deque>
#include <functional>
#include <mutex>

namespace slipbench {

class Work {
 public:
  // Told which of the crew runs it; true: there is more of it.
  using Piece = std::function<bool(std::size_t worker)>;

  void add(Piece piece) { put(begun_, std::move(piece)); }
  void add_new(Piece piece) { put(new_, std::move(piece)); }
  // Nothing new will come.
  void finish() {
    const std::lock_guard lock(mutex_);
    finished_ = true;
    changed_.notify_all();
  }
  // Nor will what waits be run.
  void close() {
    std::deque<Piece> left, also;  // freed after the lock
    const std::lock_guard lock(mutex_);
    left.swap(begun_), also.swap(new_);
    finished_ = closed_ = true;
    changed_.notify_all();
  }
  [[nodiscard]] std::size_t waiting_new() {
    const std::lock_guard lock(mutex_);
    return new_.size();
  }

  // Runs one piece for a while, waiting for one where need be; false: all is done. Throws what the piece throws.
  bool run_one(std::size_t worker) {
    Piece piece;
    {
      std::unique_lock lock(mutex_);
      changed_.wait(lock, [&] { return !begun_.empty() || !new_.empty() || (finished_ && running_ == 0); });
      std::deque<Piece>& from = begun_.empty() ? new_ : begun_;
      if (from.empty()) return false;
      piece = std::move(from.front());
      from.pop_front();
      ++running_;
    }
    bool more = false;
    try {
      more = piece(worker);
    } catch (...) {
      ended({}, false);
      throw;
    }
    ended(std::move(piece), more);
    return true;
  }

 private:
  void put(std::deque<Piece>& line, Piece piece) {
    const std::lock_guard lock(mutex_);
    if (closed_) return;
    line.push_back(std::move(piece));
    changed_.notify_one();
  }
  void ended(Piece piece, bool more) {
    const std::lock_guard lock(mutex_);
    --running_;
    if (more && !closed_) begun_.push_back(std::move(piece));
    changed_.notify_all();
  }

  std::mutex mutex_;
  std::condition_variable changed_;
  std::deque<Piece> begun_, new_;
  std::size_t running_ = 0;
  bool finished_ = false, closed_ = false;
};

}  // namespace slipbench
