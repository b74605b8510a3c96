#include "sim/sweep/command_run.hpp"

#include <fcntl.h>
#include <poll.h>
#include <spawn.h>
#include <sys/wait.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <csignal>
#include <cstring>

#include "sim/scenario/input_error.hpp"

extern char** environ;

namespace slipbench {

namespace {

struct Pipe {
  Pipe() {
    if (::pipe2(ends.data(), O_CLOEXEC) != 0) throw OutsideError(std::string("no pipe: ") + std::strerror(errno));
  }
  ~Pipe() { close_end(0), close_end(1); }
  Pipe(const Pipe&) = delete;
  Pipe& operator=(const Pipe&) = delete;
  void close_end(std::size_t i) {
    if (ends[i] >= 0) ::close(ends[i]);
    ends[i] = -1;
  }
  std::array<int, 2> ends{-1, -1};
};

void read_both(Pipe& out, Pipe& err, CommandOutcome& outcome) {
  std::array<pollfd, 2> open = {{{out.ends[0], POLLIN, 0}, {err.ends[0], POLLIN, 0}}};
  std::array<char, 4096> part;
  while (open[0].fd >= 0 || open[1].fd >= 0) {
    if (::poll(open.data(), open.size(), -1) < 0 && errno != EINTR) return;
    for (std::size_t i = 0; i < open.size(); ++i) {
      if (open[i].fd < 0 || open[i].revents == 0) continue;
      const ssize_t got = ::read(open[i].fd, part.data(), part.size());
      if (got > 0)
        (i == 0 ? outcome.out : outcome.err).append(part.data(), static_cast<std::size_t>(got));
      else if (got == 0 || errno != EINTR)
        open[i].fd = -1;
    }
  }
}

}  // namespace

CommandOutcome run_command(const std::vector<std::string>& words) {
  Pipe out, err;
  posix_spawn_file_actions_t actions;
  posix_spawn_file_actions_init(&actions);
  posix_spawn_file_actions_addopen(&actions, STDIN_FILENO, "/dev/null", O_RDONLY, 0);
  posix_spawn_file_actions_adddup2(&actions, out.ends[1], STDOUT_FILENO);
  posix_spawn_file_actions_adddup2(&actions, err.ends[1], STDERR_FILENO);
  posix_spawnattr_t attributes;
  posix_spawnattr_init(&attributes);
  sigset_t usual;  // what this program ignores its children do not
  sigemptyset(&usual);
  sigaddset(&usual, SIGPIPE);
  posix_spawnattr_setsigdefault(&attributes, &usual);
  posix_spawnattr_setpgroup(&attributes, 0);
  posix_spawnattr_setflags(&attributes, POSIX_SPAWN_SETPGROUP | POSIX_SPAWN_SETSIGDEF);
  std::vector<char*> arguments;
  for (const std::string& word : words) arguments.push_back(const_cast<char*>(word.c_str()));
  arguments.push_back(nullptr);
  pid_t child = 0;
  const int code = ::posix_spawnp(&child, arguments[0], &actions, &attributes, arguments.data(), environ);
  posix_spawn_file_actions_destroy(&actions);
  posix_spawnattr_destroy(&attributes);
  if (code != 0) throw OutsideError("cannot run '" + words.front() + "': " + std::strerror(code));
  out.close_end(1), err.close_end(1);
  CommandOutcome outcome;
  read_both(out, err, outcome);
  int status = 0;
  while (::waitpid(child, &status, 0) < 0 && errno == EINTR) {
  }
  outcome.status = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
  return outcome;
}

}  // namespace slipbench
