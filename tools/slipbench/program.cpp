#include "tools/slipbench/program.hpp"

#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cerrno>
#include <chrono>
#include <cstdlib>
#include <cstring>

#include "sim/scenario/input_error.hpp"

extern char** environ;

namespace slipbench {

namespace {

[[noreturn]] void fail(const std::string& program, int error) {
  throw OutsideError("cannot run " + program + ": " + std::strerror(error));
}

}  // namespace

ProgramAnswer run_program(const std::vector<std::string>& arguments, double most_seconds) {
  using Clock = std::chrono::steady_clock;
  int ends[2];
  if (::pipe2(ends, O_CLOEXEC) != 0) fail(arguments[0], errno);
  posix_spawn_file_actions_t actions;
  ::posix_spawn_file_actions_init(&actions);
  ::posix_spawn_file_actions_addopen(&actions, 0, "/dev/null", O_RDONLY, 0);
  ::posix_spawn_file_actions_adddup2(&actions, ends[1], 1);
  ::posix_spawn_file_actions_adddup2(&actions, ends[1], 2);
  std::vector<char*> words;
  for (const std::string& argument : arguments) words.push_back(const_cast<char*>(argument.c_str()));
  words.push_back(nullptr);
  pid_t child = 0;
  const int failed = ::posix_spawnp(&child, words[0], &actions, nullptr, words.data(), environ);
  ::posix_spawn_file_actions_destroy(&actions);
  ::close(ends[1]);
  if (failed != 0) {
    ::close(ends[0]);
    fail(arguments[0], failed);
  }
  ProgramAnswer answer;
  const auto until = Clock::now() + std::chrono::duration<double>(most_seconds);
  for (;;) {
    const auto left = std::chrono::duration_cast<std::chrono::milliseconds>(until - Clock::now()).count();
    pollfd wait{ends[0], POLLIN, 0};
    const int ready = left > 0 ? ::poll(&wait, 1, static_cast<int>(left)) : 0;
    if (ready < 0 && errno == EINTR) continue;
    if (ready <= 0) {
      answer.timed_out = true;
      ::kill(child, SIGKILL);
      break;
    }
    char text[4096];
    const ssize_t count = ::read(ends[0], text, sizeof text);
    if (count < 0 && errno == EINTR) continue;
    if (count <= 0) break;
    answer.output.append(text, static_cast<std::size_t>(count));
  }
  ::close(ends[0]);
  int status = 0;
  while (::waitpid(child, &status, 0) < 0 && errno == EINTR) {
  }
  answer.status = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
  return answer;
}

bool on_path(const std::string& program) {
  const char* path = std::getenv("PATH");
  std::string rest = path != nullptr ? path : "";
  while (!rest.empty()) {
    const std::size_t colon = std::min(rest.find(':'), rest.size());
    if (::access((rest.substr(0, colon) + "/" + program).c_str(), X_OK) == 0) return true;
    rest.erase(0, colon + 1);
  }
  return false;
}

}  // namespace slipbench
