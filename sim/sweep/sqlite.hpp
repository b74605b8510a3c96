// Small helpers over SQLite's C interface, for the store's own files.
#pragma once

#include <sqlite3.h>

#include <charconv>
#include <cmath>
#include <cstdint>
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

// A real number in the shortest text that reads back the same: SQLite's own text of it has fifteen digits.
inline std::string value_at(sqlite3_stmt* s, int column) {
  return sqlite3_column_type(s, column) == SQLITE_FLOAT ? number_text(sqlite3_column_double(s, column))
                                                        : text_at(s, column);
}

inline void bind_text(sqlite3_stmt* s, int column, const std::string& text) {
  sqlite3_bind_text(s, column, text.data(), static_cast<int>(text.size()), SQLITE_TRANSIENT);
}

// As a number where that gives the same text back, so that SQLite's tools can reckon with it.
inline void bind_value(sqlite3_stmt* s, int column, const std::string& text) {
  const char *first = text.data(), *last = first + text.size();
  std::int64_t whole = 0;
  if (const auto [end, error] = std::from_chars(first, last, whole); error == std::errc() && end == last) {
    if (std::to_string(whole) == text) {
      sqlite3_bind_int64(s, column, whole);
      return;
    }
  }
  double real = 0.0;
  const auto [end, error] = std::from_chars(first, last, real);
  if (error == std::errc() && end == last && std::isfinite(real) && number_text(real) == text)
    sqlite3_bind_double(s, column, real);
  else
    bind_text(s, column, text);
}

}  // namespace slipbench
