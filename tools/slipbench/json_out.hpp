// JSON documents of the command, in the shapes that scripts rely on. Numbers that do not exist are null. The only door to
// nlohmann-json.
#pragma once

#include <string>
#include <utility>
#include <vector>

namespace slipbench {

struct RunResult;
struct Comparison;
struct SweepResult;
struct WorstCase;
struct ExportResult;

struct ErrorDocument {
  std::string place, key, message, code;
};

// What `check` found: facts as (key, value, unit) with either a number or a text.
struct Fact {
  std::string key, label;
  double number = 0.0;
  std::string text, unit;  // text not empty: a text fact
};
struct CheckDocument {
  std::string file, kind, title;
  std::vector<Fact> facts;
};

std::string json_document(const RunResult& result);
std::string json_document(const Comparison& comparison);
std::string json_document(const SweepResult& sweep);
// `file`: what it was written to, "" for none.
std::string json_document(const WorstCase& worst, const std::string& figure, const std::string& file);
std::string json_document(const CheckDocument& check);
std::string json_document(const ExportResult& result);
std::string json_document(const ErrorDocument& error);

}  // namespace slipbench
