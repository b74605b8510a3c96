// `run --publish`: binds, says where, waits for subscribers, and tells the stream how the run ended.
#pragma once

#include <memory>
#include <optional>

#include "sim/stream/publisher.hpp"
#include "tools/slipbench/options.hpp"

namespace slipbench {

// Null when nothing is to be published. Returns when the subscribers asked for are there, or upon an interrupt.
std::unique_ptr<StreamPublisher> start_publishing(const Request& request, const Scenario& scenario);

// "stream: tcp://127.0.0.1:5600 (1 subscriber, 21 blocks, 20001 rows, none dropped)"
std::string stream_line(const StreamFigures& figures);

}  // namespace slipbench
