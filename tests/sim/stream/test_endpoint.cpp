// Where a stream may be published, and how what cannot be is refused.
#include <sys/socket.h>
#include <sys/stat.h>
#include <unistd.h>
#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>
#include <string>

#include "sim/scenario/input_error.hpp"
#include "sim/stream/publisher.hpp"

using namespace slipbench;
namespace fs = std::filesystem;

TEST_CASE("endpoint: what is accepted, and whether it stays on this machine", "[stream][contract]") {
  const auto check = [](const char* text, const char* address, bool loopback) {
    INFO(text);
    const Endpoint endpoint = parse_endpoint(text);
    CHECK(endpoint.address == address);
    CHECK(endpoint.loopback == loopback);
  };
  check("5600", "tcp://127.0.0.1:5600", true);
  check("*", "tcp://127.0.0.1:*", true);
  check("tcp://127.0.0.1:1", "tcp://127.0.0.1:1", true);
  check("tcp://localhost:65535", "tcp://127.0.0.1:65535", true);
  check("tcp://[::1]:5600", "tcp://[::1]:5600", true);
  check("tcp://*:5600", "tcp://*:5600", false);
  check("tcp://0.0.0.0:*", "tcp://0.0.0.0:*", false);
  check("tcp://192.168.0.7:5600", "tcp://192.168.0.7:5600", false);
  check("tcp://eth0:5600", "tcp://eth0:5600", false);
  check("tcp://127.example.org:5600", "tcp://127.example.org:5600", false);  // a name that begins like loopback
  check("ipc:///tmp/drive", "ipc:///tmp/drive", true);
  check("ipc://drive", "ipc://drive", true);
}

TEST_CASE("endpoint: what is malformed is refused, with what is allowed and an example", "[stream][contract]") {
  const std::string long_path = "ipc:///tmp/" + std::string(103, 'x');  // sun_path holds 107 and a zero: unix(7)
  for (const std::string& text : {std::string(""),
                                  std::string("0"),
                                  std::string("65536"),
                                  std::string("99999999999999999999"),
                                  std::string("-1"),
                                  std::string("5600 "),
                                  std::string("+5600"),
                                  std::string("56x0"),
                                  std::string("localhost"),
                                  std::string("localhost:5600"),
                                  std::string("tcp://"),
                                  std::string("tcp://127.0.0.1"),
                                  std::string("tcp://127.0.0.1:"),
                                  std::string("tcp://:5600"),
                                  std::string("tcp://127.0.0.1:0"),
                                  std::string("tcp://127.0.0.1:70000"),
                                  std::string("tcp://127.0.0.1:5600/x"),
                                  std::string("tcp://::1:5600"),
                                  std::string("tcp://[::1:5600"),
                                  std::string("tcp://a b:5600"),
                                  std::string("tcp://0;127.0.0.1:5600"),
                                  std::string("tcp://user@host:5600"),
                                  std::string("ipc://"),
                                  std::string("ipc://*"),
                                  std::string("ipc://@nobody"),
                                  long_path,
                                  std::string("udp://127.0.0.1:5600"),
                                  std::string("inproc://x"),
                                  std::string("TCP://127.0.0.1:5600"),
                                  std::string("://"),
                                  std::string("*:*"),
                                  std::string("ipc://a\0b", 9)}) {
    INFO("'" << text << "'");
    try {
      parse_endpoint(text);
      FAIL("accepted");
    } catch (const InputError& error) {
      CHECK(error.place() == "command line");
      CHECK(error.key() == "--publish");
      CHECK(error.code() == "usage");
      CHECK_THAT(error.message(), Catch::Contains("'" + text + "'") && Catch::Contains("tcp://127.0.0.1:5600"));
    }
  }
}

TEST_CASE("endpoint: what cannot be bound is told with the reason", "[stream][command]") {
  const auto refused = [](const std::string& text) -> std::string {
    try {
      const StreamPublisher publisher(parse_endpoint(text), {});
    } catch (const OutsideError& error) {
      CHECK_THAT(error.what(), Catch::Contains(parse_endpoint(text).address));
      return error.what();
    }
    return "";
  };
  const StreamPublisher first(parse_endpoint("*"), {});
  CHECK_THAT(refused(first.endpoint()), Catch::Contains("in use"));
  CHECK_THAT(refused("tcp://192.0.2.1:5600"), Catch::Contains("no such address"));  // RFC 5737: nobody's address
  const std::string folder = (fs::temp_directory_path() / ("slipbench-stream-" + std::to_string(::getpid()))).string();
  CHECK_THAT(refused("ipc://" + folder + "/none/x"), Catch::Contains("no such folder"));
  fs::create_directories(folder);
  std::ofstream(folder + "/file") << "precious";
  CHECK_THAT(refused("ipc://" + folder + "/file"), Catch::Contains("no socket"));
  CHECK(fs::file_size(folder + "/file") == 8);
  {
    const StreamPublisher served(parse_endpoint("ipc://" + folder + "/s"), {});
    CHECK_THAT(refused("ipc://" + folder + "/s"), Catch::Contains("in use"));
    CHECK(fs::is_socket(folder + "/s"));
  }
  CHECK_FALSE(fs::exists(folder + "/s"));
  fs::remove_all(folder);
}
