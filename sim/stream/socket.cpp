#include "sim/stream/socket.hpp"

#include <sys/socket.h>
#include <sys/stat.h>
#include <sys/un.h>
#include <unistd.h>

#include <algorithm>
#include <cstring>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

[[noreturn]] void refuse(const std::string& address, const std::string& why) {
  throw OutsideError("cannot publish on " + address + ": " + why);
}

// libzmq removes whatever stands at an ipc path before it binds; a file, or a socket that another program serves, is not ours.
void check_path(const Endpoint& endpoint) {
  struct stat found {};
  if (endpoint.path.empty() || ::lstat(endpoint.path.c_str(), &found) != 0) return;
  if (!S_ISSOCK(found.st_mode)) refuse(endpoint.address, "something that is no socket has that name");
  sockaddr_un address{};
  address.sun_family = AF_UNIX;
  std::memcpy(address.sun_path, endpoint.path.c_str(), endpoint.path.size());
  const int probe = ::socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0);
  if (probe < 0) return;
  const bool served = ::connect(probe, reinterpret_cast<const sockaddr*>(&address), sizeof(address)) == 0;
  ::close(probe);
  if (served) refuse(endpoint.address, "the address is in use by another program");
}

std::string why_not(int error, const Endpoint& endpoint) {
  switch (error) {
    case EADDRINUSE:
      return "the address is in use by another program; name another port, or * for a free one";
    case ENODEV:
    case EADDRNOTAVAIL:
      return "this machine has no such address; name one of its own, or * for all of them";
    case EACCES:
      return endpoint.path.empty() ? "permission denied (ports below 1024 are the system's)" : "permission denied";
    case ENOENT:
      return "no such folder";
    default:
      return zmq_strerror(error);
  }
}

// What libzmq gives back when it has done with a body.
struct Delivery {
  Message* message;
  Subscriber* to;
};

void delivered(void*, void* hint) {
  const auto* delivery = static_cast<Delivery*>(hint);
  const std::size_t size = delivery->message->size;
  MessageStore::release(*delivery->message);
  delivery->to->queued_bytes.fetch_sub(size, std::memory_order_release);
  delete delivery;
}

std::string topic_of(std::size_t topic, int number) {
  return std::string(topic_names[topic]) + "/" + std::to_string(number);
}

}  // namespace

StreamSocket::StreamSocket(const Endpoint& endpoint, std::size_t queue_bytes) : queue_bytes_(queue_bytes) {
  check_path(endpoint);
  try {
    socket_ = zmq::socket_t(context_, zmq::socket_type::xpub);
    socket_.set(zmq::sockopt::xpub_manual, true);
    socket_.set(zmq::sockopt::sndhwm, 0);  // bounded in bytes instead, by send()
    socket_.set(zmq::sockopt::ipv6, endpoint.address.find('[') != std::string::npos);
    socket_.bind(endpoint.address);
    bound_ = socket_.get(zmq::sockopt::last_endpoint);
    path_ = endpoint.path;
  } catch (const zmq::error_t& error) {
    refuse(endpoint.address, why_not(error.num(), endpoint));
  }
}

void StreamSocket::take_subscriptions() {
  zmq::message_t message;
  const auto came = [&] {
    try {
      return socket_.recv(message, zmq::recv_flags::dontwait).has_value();
    } catch (const zmq::error_t& error) {
      if (error.num() != EINTR) throw;
      return false;  // a Ctrl-C while subscribers are waited for: whoever waits asks for it
    }
  };
  while (socket_.handle() != nullptr && came()) {
    const std::string_view text = message.to_string_view();
    if (text.empty() || text.front() > 1) continue;  // a SUB sends nothing but subscriptions
    subscription(text.front() == 1, text.substr(1), zmq_msg_get(message.handle(), ZMQ_SRCFD));
  }
}

// A number names a connection: its descriptor. Of a connection that is gone, libzmq takes subscriptions back without a number.
void StreamSocket::subscription(bool begins, std::string_view prefix, int number) {
  const int change = begins ? 1 : -1;
  all_subscriptions_ += change;
  if (topic_names[static_cast<std::size_t>(Topic::samples)].starts_with(prefix)) present_ += change;
  most_present_ = std::max(most_present_, present_);
  if (begins || number >= 0) {
    Subscriber& subscriber = subscribers_[number];
    for (std::size_t topic = 0; topic < topic_names.size(); ++topic) {
      if (!topic_names[topic].starts_with(prefix)) continue;
      subscriber.subscriptions[topic] = std::max(0, subscriber.subscriptions[topic] + change);
      if (!begins && subscriber.subscriptions[topic] > 0) continue;
      const std::string own = topic_of(topic, number);
      zmq_setsockopt(socket_.handle(), begins ? ZMQ_SUBSCRIBE : ZMQ_UNSUBSCRIBE, own.data(), own.size());
      if (begins && topic == static_cast<std::size_t>(Topic::describe)) subscriber.described = false;
      // A new connection may have the number of one that is gone.
      if (begins && subscriber.queued_bytes.load(std::memory_order_acquire) == 0) subscriber.forget();
    }
  }
  if (all_subscriptions_ <= 0) {
    std::erase_if(subscribers_,
                  [](const auto& s) { return s.second.queued_bytes.load(std::memory_order_acquire) == 0; });
  }
}

void StreamSocket::wait(std::chrono::milliseconds atmost) {
  zmq_pollitem_t item{socket_.handle(), 0, ZMQ_POLLIN, 0};
  zmq_poll(&item, 1, static_cast<long>(atmost.count()));
}

bool StreamSocket::send(int number, Subscriber& to, Topic topic, Message& message) {
  if (!to.wants(topic)) return true;
  const std::size_t limit = std::min(queue_bytes_, 4 * queue_bytes_ / subscribers_.size());
  const bool room = to.queued_bytes.load(std::memory_order_acquire) + message.size <= limit;
  if (topic == Topic::samples) {
    to.started |= room;
    if (!room) to.miss(1);
  }
  if (!room && topic != Topic::end) return false;
  message.holders.fetch_add(1, std::memory_order_relaxed);
  to.queued_bytes.fetch_add(message.size, std::memory_order_relaxed);
  const std::string head = topic_of(static_cast<std::size_t>(topic), number);
  zmq::message_t body(message.bytes.get(), message.size, delivered, new Delivery{&message, &to});
  socket_.send(zmq::buffer(head), zmq::send_flags::sndmore | zmq::send_flags::dontwait);
  socket_.send(body, zmq::send_flags::dontwait);
  return true;
}

std::size_t StreamSocket::longest_queue() const {
  std::size_t longest = 0;
  for (const auto& [number, s] : subscribers_)
    longest = std::max(longest, s.queued_bytes.load(std::memory_order_acquire));
  return longest;
}

void StreamSocket::flush() {
  using namespace std::chrono;
  const auto begun = steady_clock::now();
  for (auto now = begun; now - begun < milliseconds(2000); now = steady_clock::now()) {
    bool waiting = false;
    for (auto& [number, s] : subscribers_) {
      const std::size_t queued = s.queued_bytes.load(std::memory_order_acquire);
      if (now == begun || queued != s.seen_queued) s.seen_queued = queued, s.moved = now;
      waiting |= queued > 0 && (s.missed == 0 || now - s.moved < milliseconds(200));
    }
    if (!waiting) return;
    take_subscriptions();
    wait(milliseconds(1));
  }
}

void StreamSocket::close(std::chrono::milliseconds linger) {
  if (socket_.handle() == nullptr) return;
  socket_.set(zmq::sockopt::linger, static_cast<int>(linger.count()));
  socket_.close();
  context_.close();
  if (!path_.empty()) ::unlink(path_.c_str());  // libzmq leaves it there
}

}  // namespace slipbench
