// Small helpers over SQLite's C interface, for the store's own files.
#pragma once

#include <sqlite3.h>

#include <string>

#include "sim/scenario/tree.hpp"

namespace slipbench {

inline constexpr int fixed = 4;  // columns of a result before its keys: "case", run, status, message

inline std::string quoted(const std::string& name) {
  std::string out = "\"";
  for (const char c : name) out += c == '"' ? std::string("\"\"") : std::string(1, c);
  return out + "\"";
}

// Finalises when it leaves.
struct Statement {
  explicit Statement(sqlite3_stmt* s) : at(s) {}
  ~Statement() { sqlite3_finalize(at); }
  Statement(const Statement&) = delete;
  Statement& operator=(const Statement&) = delete;
  sqlite3_stmt* at;
};

inline std::string text_at(sqlite3_stmt* s, int column) {
  const auto* text = reinterpret_cast<const char*>(sqlite3_column_text(s, column));
  return text == nullptr ? std::string() : std::string(text, static_cast<std::size_t>(sqlite3_column_bytes(s, column)));
}

// A number in the shortest text that reads back the same: SQLite's own text of it has fifteen digits.
inline std::string value_at(sqlite3_stmt* s, int column) {
  const int type = sqlite3_column_type(s, column);
  return type == SQLITE_FLOAT || type == SQLITE_INTEGER ? number_text(sqlite3_column_double(s, column))
                                                        : text_at(s, column);
}

inline void bind_text(sqlite3_stmt* s, int column, const std::string& text) {
  sqlite3_bind_text(s, column, text.data(), static_cast<int>(text.size()), SQLITE_TRANSIENT);
}

}  // namespace slipbench
