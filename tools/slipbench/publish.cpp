#include "tools/slipbench/publish.hpp"

#include <fmt/format.h>

#include <filesystem>

#include "tools/slipbench/interrupt.hpp"

namespace slipbench {

std::unique_ptr<StreamPublisher> start_publishing(const Request& request, const Scenario& scenario) {
  if (!request.publish) return nullptr;
  const Endpoint endpoint = parse_endpoint(*request.publish);
  const std::string title =
      scenario.title.empty() ? std::filesystem::path(request.file).filename().string() : scenario.title;
  auto publisher = std::make_unique<StreamPublisher>(endpoint, StreamLabel{SLIPBENCH_VERSION, title, scenario.seed});
  const auto say = [&](const std::string& text) {
    if (!request.quiet) fmt::print(stderr, "{}\n", text);
  };
  say("publishing on " + publisher->endpoint());
  if (!endpoint.loopback) say("warning: not loopback: anyone on that network can read this run");
  if (request.publish_wait > 0) {
    say(fmt::format("waiting for {} subscriber{} (Ctrl-C to stop)", request.publish_wait,
                    request.publish_wait == 1 ? "" : "s"));
    publisher->wait_for(request.publish_wait, [] { return !interrupted(); });
  }
  return publisher;
}

std::string stream_line(const StreamFigures& f) {
  return fmt::format("stream: {} ({} subscriber{}, {} blocks, {} rows, {} dropped)", f.endpoint, f.subscribers,
                     f.subscribers == 1 ? "" : "s", f.blocks, f.rows,
                     f.dropped == 0 ? "none" : fmt::format("{} blocks", f.dropped));
}

}  // namespace slipbench
