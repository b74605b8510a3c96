// The one exception of bad input: where it stands, which key, what was found, what is allowed.
#pragma once

#include <stdexcept>
#include <string>

namespace slipbench {

// `place` is "file:line:column" or "--set:key"; exit status 2. message() is the sentence without the place.
class InputError : public std::runtime_error {
 public:
  InputError(std::string place, std::string key, std::string message, std::string code = "input")
      : std::runtime_error(place + (place.empty() ? "" : ": ") + message),
        place_(std::move(place)),
        key_(std::move(key)),
        message_(std::move(message)),
        code_(std::move(code)) {}
  [[nodiscard]] const std::string& place() const { return place_; }
  [[nodiscard]] const std::string& key() const { return key_; }
  [[nodiscard]] const std::string& message() const { return message_; }
  [[nodiscard]] const std::string& code() const { return code_; }

 private:
  std::string place_, key_, message_, code_;
};

// Something outside failed: output file, network, store. Exit status 3.
class OutsideError : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

}  // namespace slipbench
