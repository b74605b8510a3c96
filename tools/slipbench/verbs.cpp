#include "tools/slipbench/verbs.hpp"

#include <cerrno>
#include <cstdio>
#include <cstring>

namespace slipbench {

std::string kind_text(FileKind kind) {
  switch (kind) {
    case FileKind::scenario:
      return "a scenario";
    case FileKind::machine:
      return "a machine file";
    case FileKind::plan:
      return "a sweep plan";
    case FileKind::system:
      return "a state-space file";
    case FileKind::gains:
      return "a gain file";
  }
  return "a file of another kind";
}

void want_scenario(const Request& request) {
  const FileKind kind = kind_of_file(request.file);
  if (kind == FileKind::scenario) return;
  throw InputError(request.file, "", request.verb + " wants a scenario (a file with [run]); this is " + kind_text(kind),
                   "kind");
}

void want_plan(const Request& request) {
  const FileKind kind = kind_of_file(request.file);
  if (kind == FileKind::plan) return;
  throw InputError(request.file, "",
                   request.verb + " wants a sweep plan (a file with scenario = \"...\"); this is " + kind_text(kind),
                   "kind");
}

void print(const std::string& text) {
  errno = 0;
  const bool written = std::fwrite(text.data(), 1, text.size(), stdout) == text.size() && std::fflush(stdout) == 0;
  if (!written)
    throw OutsideError(std::string("cannot write to standard output: ") + std::strerror(errno != 0 ? errno : EIO));
}

}  // namespace slipbench
