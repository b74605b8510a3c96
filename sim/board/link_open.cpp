#include "sim/board/link_open.hpp"

#include <fcntl.h>
#include <spawn.h>
#include <sys/mman.h>
#include <sys/socket.h>
#include <sys/un.h>
#include <termios.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <csignal>
#include <cstring>
#include <utility>

#include "sim/scenario/input_error.hpp"

extern char** environ;

namespace slipbench {

namespace {

[[noreturn]] void failed(const std::string& link, const std::string& what) {
  throw OutsideError("link " + link + ": " + what);
}

// The child's standard input and output are `in` and `out`, its standard error `said` unless that is -1; its process group is its own, its signals the usual ones.
pid_t start(const std::vector<std::string>& words, int in, int out, int said, const std::string& link) {
  std::vector<char*> arguments;
  for (const std::string& word : words) arguments.push_back(const_cast<char*>(word.c_str()));
  arguments.push_back(nullptr);
  posix_spawn_file_actions_t files;
  posix_spawn_file_actions_init(&files);
  posix_spawn_file_actions_adddup2(&files, in, STDIN_FILENO);
  posix_spawn_file_actions_adddup2(&files, out, STDOUT_FILENO);
  if (said >= 0) posix_spawn_file_actions_adddup2(&files, said, STDERR_FILENO);
  posix_spawnattr_t how;
  posix_spawnattr_init(&how);
  sigset_t usual;
  sigemptyset(&usual);
  for (const int signal : {SIGPIPE, SIGXFSZ, SIGINT, SIGTERM, SIGHUP}) sigaddset(&usual, signal);
  posix_spawnattr_setsigdefault(&how, &usual);
  posix_spawnattr_setflags(&how, POSIX_SPAWN_SETSIGDEF | POSIX_SPAWN_SETPGROUP);
  pid_t child = 0;
  const int error = posix_spawnp(&child, arguments[0], &files, &how, arguments.data(), environ);
  posix_spawn_file_actions_destroy(&files);
  posix_spawnattr_destroy(&how);
  if (error == ENOENT) {
    const bool emulator = words[0].starts_with("qemu");
    failed(link,
           words[0] + " is not there" + (emulator ? ": tools/packages --tests installs it (qemu-system-arm)" : ""));
  }
  if (error != 0) failed(link, "cannot start " + words[0] + ": " + std::strerror(error));
  return child;
}

std::unique_ptr<Link> by_pipes(const std::vector<std::string>& words, const std::string& link, int said = -1) {
  std::array<int, 2> to{}, from{};
  if (pipe2(to.data(), O_CLOEXEC) != 0) failed(link, std::strerror(errno));
  if (pipe2(from.data(), O_CLOEXEC) != 0) {
    close(to[0]), close(to[1]);
    failed(link, std::strerror(errno));
  }
  const auto close_all = [](int a, int b) { close(a), close(b); };
  try {
    const pid_t child = start(words, to[0], from[1], said, link);
    close_all(to[0], from[1]);
    return std::make_unique<Link>(from[0], to[1], child, link, said);
  } catch (...) {
    close_all(to[0], to[1]), close_all(from[0], from[1]);
    throw;
  }
}

// The board's end of a socket pair is the child's standard input.
std::unique_ptr<Link> by_socket_pair(const std::vector<std::string>& words, const std::string& link, int said) {
  std::array<int, 2> ends{};
  if (socketpair(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0, ends.data()) != 0) failed(link, std::strerror(errno));
  try {
    const pid_t child = start(words, ends[1], STDERR_FILENO, said, link);
    close(ends[1]);
    return std::make_unique<Link>(ends[0], ends[0], child, link, said);
  } catch (...) {
    close(ends[0]), close(ends[1]);
    throw;
  }
}

std::unique_ptr<Link> by_unix_socket(const std::string& path, const std::string& link) {
  sockaddr_un address{};
  address.sun_family = AF_UNIX;
  if (path.size() >= sizeof address.sun_path) failed(link, "the path is too long for a socket (107 bytes)");
  std::memcpy(address.sun_path, path.c_str(), path.size() + 1);
  const int fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0);
  if (fd < 0) failed(link, std::strerror(errno));
  if (connect(fd, reinterpret_cast<const sockaddr*>(&address), sizeof address) != 0) {
    const int error = errno;
    close(fd);
    failed(link, std::string("cannot connect: ") + std::strerror(error) + "; a board must be listening there");
  }
  return std::make_unique<Link>(fd, fd, 0, link);
}

constexpr std::pair<long, speed_t> rates[] = {
    {9600, B9600},       {19200, B19200},     {38400, B38400},     {57600, B57600},     {115200, B115200},
    {230400, B230400},   {460800, B460800},   {500000, B500000},   {921600, B921600},   {1000000, B1000000},
    {1500000, B1500000}, {2000000, B2000000}, {3000000, B3000000}, {4000000, B4000000},
};

std::unique_ptr<Link> by_serial(const std::string& device, long baud, const std::string& link) {
  const int fd = open(device.c_str(), O_RDWR | O_NOCTTY | O_CLOEXEC | O_NONBLOCK);
  if (fd < 0) failed(link, std::string("cannot open: ") + std::strerror(errno));
  termios settings{};
  if (tcgetattr(fd, &settings) != 0) {
    close(fd);
    failed(link, "this is no serial device");
  }
  cfmakeraw(&settings);
  settings.c_cflag |= CLOCAL | CREAD;
  for (const auto& [rate, code] : rates) {
    if (rate == baud) cfsetispeed(&settings, code), cfsetospeed(&settings, code);
  }
  if (tcsetattr(fd, TCSANOW, &settings) != 0) {
    const int error = errno;
    close(fd);
    failed(link, std::string("cannot set the line up: ") + std::strerror(error));
  }
  tcflush(fd, TCIOFLUSH);
  return std::make_unique<Link>(fd, fd, 0, link);
}

[[noreturn]] void refuse(const std::string& message) { throw InputError("command line", "--link", message, "usage"); }

void want_file(const std::string& path, const std::string& link) {
  if (access(path.c_str(), R_OK) == 0) return;
  failed(link,
         "this build has no " + path +
             (path.ends_with(".elf") ? ": arm-none-eabi-gcc was not there when it was made (tools/packages --tests "
                                       "installs it); --link host runs the same sources"
                                     : ""));
}

// QEMU always warns of a network card without a network: what it says is told only when the board is gone.
int emulator_speech() { return memfd_create("emulator", MFD_CLOEXEC); }

std::vector<std::string> emulator(const std::string& image) {
  // One instruction is 2^7 ns of the board's time, always: counts repeat from run to run.
  return {"qemu-system-arm", "-M",  "mps2-an386", "-nodefaults",      "-display", "none",
          "-kernel",         image, "-icount",    "shift=7,sleep=off"};
}

}  // namespace

long baud_of(std::string_view link) {
  const std::size_t at = link.rfind('@');
  if (!link.starts_with("serial:") || at == std::string_view::npos) return 0;
  const std::string digits(link.substr(at + 1));
  const bool whole =
      !digits.empty() && digits.size() < 9 && digits.find_first_not_of("0123456789") == std::string::npos;
  const long baud = whole ? std::stol(digits) : 0;
  for (const auto& [rate, code] : rates) {
    if (rate == baud) return baud;
  }
  std::string known;
  for (const auto& [rate, code] : rates) known += (known.empty() ? "" : ", ") + std::to_string(rate);
  refuse("--link '" + std::string(link) + "': no serial line runs at '" + digits + "' baud here; there are " + known);
}

bool started_here(std::string_view link) { return !link.starts_with("unix:") && !link.starts_with("serial:"); }

std::unique_ptr<Link> open_link(const std::string& link, const FirmwareFiles& firmware) {
  const std::size_t colon = link.find(':');
  const std::string kind = link.substr(0, colon), rest = colon == std::string::npos ? "" : link.substr(colon + 1);
  if (colon == std::string::npos) {
    if (kind == "host") {
      want_file(firmware.host, link);
      return by_pipes({firmware.host}, link);
    }
    if (kind == "emulated") {
      want_file(firmware.semihosting, link);
      std::vector<std::string> words = emulator(firmware.semihosting);
      words.insert(words.end(), {"-semihosting-config",
                                 "enable=on,target=native,arg=board,arg=/proc/self/fd/0,arg=/proc/self/fd/1"});
      return by_pipes(words, link, emulator_speech());
    }
    if (kind == "emulated_uart") {
      want_file(firmware.uart, link);
      std::vector<std::string> words = emulator(firmware.uart);
      words.insert(words.end(), {"-chardev", "socket,id=line,fd=0", "-serial", "chardev:line"});
      return by_socket_pair(words, link, emulator_speech());
    }
  } else if (!rest.empty()) {
    if (kind == "pipe") return by_pipes({"/bin/sh", "-c", rest}, link);
    if (kind == "unix") return by_unix_socket(rest, link);
    if (kind == "serial") {
      const long baud = baud_of(link);
      return by_serial(baud > 0 ? rest.substr(0, rest.rfind('@')) : rest, baud, link);
    }
  }
  refuse("--link '" + link +
         "': expected pipe:COMMAND, unix:PATH, serial:DEVICE or serial:DEVICE@BAUD, "
         "replay:FILE.frames, host, emulated or emulated_uart");
}

}  // namespace slipbench
