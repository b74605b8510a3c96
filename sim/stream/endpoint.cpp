#include "sim/stream/endpoint.hpp"

#include <sys/un.h>

#include <algorithm>
#include <charconv>
#include <string_view>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

constexpr std::string_view forms =
    "expected tcp://HOST:PORT, ipc://PATH or PORT, as in tcp://127.0.0.1:5600, ipc:///tmp/drive or 5600; "
    "PORT * takes a free one";

[[noreturn]] void refuse(const std::string& text, const std::string& why) {
  throw InputError("command line", "--publish", "--publish '" + text + "': " + why + "; " + std::string(forms),
                   "usage");
}

bool all_digits(std::string_view text) {
  return !text.empty() && std::all_of(text.begin(), text.end(), [](char c) { return c >= '0' && c <= '9'; });
}

// "5600" or "*".
std::string checked_port(const std::string& text, std::string_view port) {
  if (port == "*") return "*";
  if (!all_digits(port)) refuse(text, "the port '" + std::string(port) + "' is neither a number nor *");
  int number = 0;
  const auto [end, error] = std::from_chars(port.data(), port.data() + port.size(), number);
  if (error != std::errc{} || number < 1 || number > 65535) refuse(text, "a port runs from 1 to 65535");
  return std::to_string(number);
}

bool odd(char c) { return c <= ' ' || c == '\x7f'; }

Endpoint tcp(const std::string& text, std::string_view rest) {
  const std::size_t colon = rest.rfind(':');
  if (colon == std::string_view::npos) refuse(text, "no port");
  std::string host(rest.substr(0, colon));
  const std::string port = checked_port(text, rest.substr(colon + 1));
  if (host.empty()) refuse(text, "no host (* means every network of this machine)");
  const bool bracketed = host.size() > 2 && host.front() == '[' && host.back() == ']';
  if (!bracketed && host.find_first_of(":[]") != std::string::npos) {
    refuse(text, "an IPv6 address stands in brackets, as in tcp://[::1]:5600");
  }
  if (host.find_first_of("/;@,") != std::string::npos || std::any_of(host.begin(), host.end(), odd)) {
    refuse(text, "'" + host + "' is no host");
  }
  if (host == "localhost") host = "127.0.0.1";  // a socket is bound to an address or an interface, not to a name
  const bool loopback = host == "[::1]" || (host.starts_with("127.") && std::count(host.begin(), host.end(), '.') == 3);
  return {"tcp://" + host + ":" + port, "", loopback};
}

Endpoint ipc(const std::string& text, const std::string& path) {
  constexpr std::size_t longest = sizeof(sockaddr_un::sun_path) - 1;
  if (path.empty()) refuse(text, "no path");
  // Libzmq takes these for a name of its own choice and for one that is no file (and that nobody would remove).
  if (path == "*" || path.front() == '@') refuse(text, "ipc wants the path of a file");
  if (path.size() > longest) refuse(text, "the path is longer than " + std::to_string(longest) + " characters");
  if (path.find('\0') != std::string::npos) refuse(text, "the path has a zero character in it");
  return {"ipc://" + path, path, true};
}

}  // namespace

Endpoint parse_endpoint(const std::string& text) {
  if (text.empty()) refuse(text, "nothing is named");
  if (text.starts_with("tcp://")) return tcp(text, std::string_view(text).substr(6));
  if (text.starts_with("ipc://")) return ipc(text, text.substr(6));
  if (const std::size_t at = text.find("://"); at != std::string::npos) {
    refuse(text, "'" + text.substr(0, at) + "' is no transport of the stream");
  }
  if (text != "*" && !all_digits(text)) refuse(text, "neither a port nor a transport");
  return {"tcp://127.0.0.1:" + checked_port(text, text), "", true};
}

}  // namespace slipbench
