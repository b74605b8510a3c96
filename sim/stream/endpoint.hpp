// Where a stream is published: tcp://HOST:PORT, ipc://PATH or a bare PORT (then on loopback); PORT may be * for a free one.
#pragma once

#include <string>

namespace slipbench {

struct Endpoint {
  std::string address;   // as ZeroMQ wants it: "tcp://127.0.0.1:5600", "ipc:///run/user/1000/drive"
  std::string path;      // of ipc, else empty
  bool loopback = true;  // nobody outside this machine can connect
};

// Throws InputError with code "usage", place "command line", key "--publish".
Endpoint parse_endpoint(const std::string& text);

}  // namespace slipbench
