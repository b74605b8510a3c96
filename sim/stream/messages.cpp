#include "sim/stream/messages.hpp"

#include <bit>
#include <cstring>
#include <msgpack.hpp>
#include <string_view>

namespace slipbench {

static_assert(std::endian::native == std::endian::little, "float64 goes out as it lies in memory");

namespace {

// Where the packer writes: straight into the message.
struct Writer {
  char* at;
  void write(const char* data, std::size_t size) {
    std::memcpy(at, data, size);
    at += size;
  }
};

using Packer = msgpack::packer<Writer>;

void text(Packer& p, std::string_view s) {
  p.pack_str(static_cast<std::uint32_t>(s.size()));
  p.pack_str_body(s.data(), static_cast<std::uint32_t>(s.size()));
}

// A real number always as float64: the packer itself would turn 2.0 into an integer.
void real(Writer& writer, double number) {
  const auto bits = std::bit_cast<std::uint64_t>(number);
  writer.write("\xcb", 1);
  for (int shift = 56; shift >= 0; shift -= 8) {
    const char byte = static_cast<char>(bits >> shift);
    writer.write(&byte, 1);
  }
}

template <class Value>
void pair(Writer& writer, std::string_view key, const Value& value) {
  Packer p(writer);
  text(p, key);
  if constexpr (std::is_convertible_v<Value, std::string_view>) {
    text(p, value);
  } else if constexpr (std::is_floating_point_v<Value>) {
    real(writer, value);
  } else {
    p.pack(value);
  }
}

// Room for keys, numbers and markers of any one map, texts and columns apart.
constexpr std::size_t fixed_part = 256;
constexpr std::size_t marker = 5;  // the longest head of a text or a bin

}  // namespace

Message& MessageStore::take(std::size_t size) {
  for (const auto& message : messages_) {
    if (message->capacity >= size && message->holders.load(std::memory_order_acquire) == 0) {
      message->holders.store(1, std::memory_order_relaxed);
      message->size = size;
      message->samples = message->dropped = false;
      return *message;
    }
  }
  auto message = std::make_unique<Message>();
  message->bytes = std::make_unique<char[]>(size);
  message->capacity = message->size = size;
  message->holders.store(1, std::memory_order_relaxed);
  bytes_ += size;
  messages_.push_back(std::move(message));
  return *messages_.back();
}

std::int64_t MessageStore::samples_held() const {
  std::int64_t held = 0;
  for (const auto& m : messages_) held += m->samples && !m->dropped && m->holders.load(std::memory_order_acquire) > 0;
  return held;
}

Message& describe_message(MessageStore& store, const StreamDescription& d) {
  std::size_t room = fixed_part + d.version.size() + d.run.size() + d.scenario.size();
  for (const Column& c : d.columns) room += 64 + c.name.size() + c.unit.size() + c.meaning.size();
  Message& message = store.take(room);
  Writer writer{message.bytes.get()};
  Packer p(writer);
  p.pack_map(8);
  pair(writer, "version", stream_protocol_version);
  pair(writer, "slipbench", d.version);
  pair(writer, "run", d.run);
  pair(writer, "scenario", d.scenario);
  pair(writer, "seed", d.seed);
  pair(writer, "period_s", d.period_s);
  pair(writer, "duration_s", d.duration_s);
  text(p, "columns");
  p.pack_array(static_cast<std::uint32_t>(d.columns.size()));
  for (const Column& c : d.columns) {
    p.pack_map(3);
    pair(writer, "name", c.name);
    pair(writer, "unit", c.unit);
    pair(writer, "meaning", c.meaning);
  }
  message.size = static_cast<std::size_t>(writer.at - message.bytes.get());
  return message;
}

Message& samples_message(MessageStore& store, const StreamDescription& d, const Block& block, std::size_t stride) {
  const std::size_t column_bytes = block.rows * sizeof(double), full_bytes = stride * sizeof(double);
  // Room for a full block whatever this one has, so that every buffer serves every block.
  Message& message = store.take(fixed_part + d.run.size() + d.columns.size() * (marker + full_bytes));
  message.samples = true;
  Writer writer{message.bytes.get()};
  Packer p(writer);
  p.pack_map(6);
  pair(writer, "run", d.run);
  pair(writer, "sequence", block.sequence);
  pair(writer, "first_tick", block.first_row);
  pair(writer, "period_s", d.period_s);
  pair(writer, "rows", block.rows);
  text(p, "columns");
  p.pack_array(static_cast<std::uint32_t>(d.columns.size()));
  for (std::size_t c = 0; c < d.columns.size(); ++c) {
    p.pack_bin(static_cast<std::uint32_t>(column_bytes));
    p.pack_bin_body(reinterpret_cast<const char*>(block.values + c * stride), static_cast<std::uint32_t>(column_bytes));
  }
  message.size = static_cast<std::size_t>(writer.at - message.bytes.get());
  return message;
}

Message& end_message(MessageStore& store, const StreamEnd& end) {
  Message& message = store.take(fixed_part + end.run.size() + end.status.size());
  Writer writer{message.bytes.get()};
  Packer p(writer);
  p.pack_map(6);
  pair(writer, "run", end.run);
  pair(writer, "status", end.status);
  pair(writer, "blocks", end.blocks);
  pair(writer, "rows", end.rows);
  pair(writer, "dropped", end.dropped);
  pair(writer, "missed", end.missed);
  message.size = static_cast<std::size_t>(writer.at - message.bytes.get());
  return message;
}

}  // namespace slipbench
