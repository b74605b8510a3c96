// slipbench VERB FILE [options]: the command. Exit status: 0 done, 1 the result is bad, 2 bad usage or input, 3 something
// outside failed, 130 interrupted.
#include <algorithm>
#include <csignal>
#include <cstdio>
#include <exception>
#include <string>
#include <vector>

#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/verbs.hpp"

using namespace slipbench;

namespace {

int fail(bool json, const ErrorDocument& error, const std::string& text, int status) {
  if (json) std::fputs(json_document(error).c_str(), stdout);
  std::fputs((text + "\n").c_str(), stderr);
  return status;
}

int work(const std::vector<std::string>& arguments) {
  const CommandLine line = parse_command_line(arguments);
  if (!line.request) {
    print(line.text);
    return ExitStatus::done;
  }
  if (line.request->verb == "run") return run_verb(*line.request);
  if (line.request->verb == "check") return check_verb(*line.request);
  if (line.request->verb == "export") return export_verb(*line.request);
  if (line.request->verb == "sweep") return sweep_verb(*line.request);
  if (line.request->verb == "analyse") return analyse_verb(*line.request);
  if (line.request->verb == "design") return design_verb(*line.request);
  if (line.request->verb == "board") return board_verb(*line.request);
  return compare_verb(*line.request);
}

}  // namespace

int main(int count, char** words) {
  const std::vector<std::string> arguments(words + std::min(count, 1), words + count);
  const bool json = std::find(arguments.begin(), arguments.end(), "--json") != arguments.end();
  catch_interrupts();
  std::signal(SIGPIPE, SIG_IGN);  // a closed pipe is then an error like any other
  std::signal(SIGXFSZ, SIG_IGN);  // likewise a file that grows beyond the user's limit
  try {
    return work(arguments);
  } catch (const InputError& e) {
    return fail(json, {e.place(), e.key(), e.message(), e.code()}, e.what(), ExitStatus::bad_input);
  } catch (const OutsideError& e) {
    return fail(json, {"", "", e.what(), "outside"}, e.what(), ExitStatus::outside_failed);
  } catch (const std::exception& e) {
    const std::string text = std::string("fault in slipbench itself: ") + e.what();
    return fail(json, {"", "", text, "internal"}, text, ExitStatus::outside_failed);
  }
}
