#include "sim/sweep/store.hpp"

#include <sqlite3.h>

#include <cerrno>

#include "sim/scenario/input_error.hpp"
#include "sim/sweep/sqlite.hpp"

namespace slipbench {

namespace {

// Rows of run ?1 from case ?2 to below ?3. Runs of a case lie side by side: of a few all are read, of many each case is looked up.
const char* count_text(const Origin& origin) {
  constexpr std::size_t few = 1;  // digits
  for (const auto& [item, content] : origin) {
    if (item == "runs" && content.size() > few) {
      return "WITH RECURSIVE k(c) AS (SELECT ?2 WHERE ?2 < ?3 UNION ALL SELECT c + 1 FROM k WHERE c + 1 < ?3) SELECT "
             "count(*) "
             "FROM k CROSS JOIN result ON result.\"case\" = c AND result.run = ?1";
    }
  }
  return "SELECT count(*) FROM result WHERE run = ?1 AND \"case\" >= ?2 AND \"case\" < ?3";
}

}  // namespace

Store::Store(const std::string& path, const Origin& origin, const StoreColumns& columns)
    : path_(path), origin_(origin), columns_(columns) {
  open(true);
  try {
    // The lock first: then SQLite shares no memory beside the file, which would not work over a network's file system.
    execute("PRAGMA locking_mode = EXCLUSIVE; PRAGMA journal_mode = WAL; PRAGMA synchronous = NORMAL;");
    // An empty file is a store that was killed before its tables stood.
    const Statement tables(prepare("SELECT count(*) FROM sqlite_master"));
    if (sqlite3_step(tables.at) != SQLITE_ROW) fail(sqlite3_errcode(db_));
    if (sqlite3_column_int(tables.at, 0) == 0) {
      make();
    } else {
      read_origin();
      demand_same(origin);
      if (columns_.keys != columns.keys || columns_.figures != columns.figures)
        throw InputError(path_, "", "the store has other columns than this plan gives; name another --store", "store");
    }
    std::string marks = "?";
    for (std::size_t i = 1; i < fixed + columns.keys.size() + columns.figures.size(); ++i) marks += ",?";
    insert_ = prepare("INSERT OR REPLACE INTO result VALUES (" + marks + ")");
    count_ = prepare(count_text(origin_));
  } catch (...) {
    sqlite3_finalize(insert_);
    sqlite3_close(db_);
    throw;
  }
}

Store::Store(const std::string& path) : path_(path) {
  open(false);
  try {
    read_origin();
    count_ = prepare(count_text(origin_));
  } catch (...) {
    sqlite3_close(db_);
    throw;
  }
}

Store::~Store() {
  sqlite3_finalize(insert_);
  sqlite3_finalize(count_);
  sqlite3_close(db_);
}

void Store::open(bool writable) {
  const int flags = writable ? SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE : SQLITE_OPEN_READONLY;
  if (sqlite3_open_v2(path_.c_str(), &db_, flags, nullptr) != SQLITE_OK) {
    const int system = db_ != nullptr ? sqlite3_system_errno(db_) : 0;
    sqlite3_close(db_);
    db_ = nullptr;
    cannot_open(system);
  }
  if (writable && sqlite3_db_readonly(db_, "main") == 1) {
    sqlite3_close(db_);
    db_ = nullptr;
    cannot_open(EACCES);
  }
  if (!writable && !beside_is_writable() && !unfinished()) open_as_it_stands();
}

// SQLite reads a WAL file by help of another one beside it. Where that cannot be made and nothing is left in the WAL, the file alone is
// the whole store.
void Store::open_as_it_stands() {
  sqlite3_close(db_);
  db_ = nullptr;
  std::string uri = "file:";
  for (const char c : path_) {
    constexpr char hex[] = "0123456789ABCDEF";
    const auto byte = static_cast<unsigned char>(c);
    const bool plain = c != '%' && c != '?' && c != '#' && byte > 0x20;
    uri += plain ? std::string(1, c) : std::string("%") + hex[byte >> 4] + hex[byte & 15];
  }
  if (sqlite3_open_v2((uri + "?immutable=1").c_str(), &db_, SQLITE_OPEN_READONLY | SQLITE_OPEN_URI, nullptr) ==
      SQLITE_OK)
    return;
  sqlite3_close(db_);
  db_ = nullptr;
  cannot_open(0);
}

void Store::make() {
  std::string sql =
      "BEGIN; CREATE TABLE about (item TEXT PRIMARY KEY, content TEXT NOT NULL) WITHOUT ROWID;"
      "CREATE TABLE result (\"case\" INTEGER NOT NULL, run INTEGER NOT NULL, status TEXT NOT NULL, message TEXT";
  for (const std::string& key : columns_.keys) sql += ", " + quoted(key);  // as it comes: a number or a text
  for (const std::string& figure : columns_.figures) sql += ", " + quoted(figure) + " REAL";
  execute(sql + ", PRIMARY KEY (\"case\", run)) WITHOUT ROWID;");
  const Statement add(prepare("INSERT INTO about VALUES (?, ?)"));
  for (const auto& [item, content] : origin_) {
    bind_text(add.at, 1, item);
    bind_text(add.at, 2, content);
    if (sqlite3_step(add.at) != SQLITE_DONE) fail(sqlite3_errcode(db_));
    sqlite3_reset(add.at);
  }
  execute("COMMIT");
}

void Store::read_origin() {
  origin_.clear();
  columns_ = {};
  const Statement tables(prepare("SELECT count(*) FROM sqlite_master WHERE name IN ('about', 'result')"));
  if (sqlite3_step(tables.at) != SQLITE_ROW) fail(sqlite3_errcode(db_));
  const Statement items(prepare("SELECT count(*) FROM pragma_table_info('about') WHERE name IN ('item', 'content')"));
  if (sqlite3_column_int(tables.at, 0) != 2 || sqlite3_step(items.at) != SQLITE_ROW ||
      sqlite3_column_int(items.at, 0) != 2)
    throw InputError(path_, "", "this SQLite file is no store of a sweep; name another --store", "store");
  const Statement about(prepare("SELECT item, content FROM about"));
  while (sqlite3_step(about.at) == SQLITE_ROW) origin_.emplace_back(text_at(about.at, 0), text_at(about.at, 1));
  const Statement columns(prepare("SELECT name, type FROM pragma_table_info('result') ORDER BY cid"));
  for (int i = 0; sqlite3_step(columns.at) == SQLITE_ROW; ++i) {
    if (i < fixed) continue;
    (text_at(columns.at, 1) == "REAL" ? columns_.figures : columns_.keys).push_back(text_at(columns.at, 0));
  }
}

void Store::write(const std::vector<ResultRow>& batch) {
  if (batch.empty()) return;
  execute("BEGIN IMMEDIATE");
  for (const ResultRow& row : batch) {
    int at = 1;
    sqlite3_bind_int64(insert_, at++, static_cast<sqlite3_int64>(row.case_number));
    sqlite3_bind_int64(insert_, at++, row.run);
    bind_text(insert_, at++, row.status);
    if (row.message.empty())
      sqlite3_bind_null(insert_, at++);
    else
      bind_text(insert_, at++, row.message);
    for (const std::string& value : row.values) bind_value(insert_, at++, value);
    for (const Figure& figure : row.figures) {
      if (figure)
        sqlite3_bind_double(insert_, at++, *figure);
      else
        sqlite3_bind_null(insert_, at++);
    }
    const int code = sqlite3_step(insert_);
    sqlite3_reset(insert_);
    if (code != SQLITE_DONE) undo_and_fail();
  }
  if (sqlite3_exec(db_, "COMMIT", nullptr, nullptr, nullptr) != SQLITE_OK) undo_and_fail();
}

std::uint64_t Store::rows() const {
  const Statement all(prepare("SELECT count(*) FROM result"));
  if (sqlite3_step(all.at) != SQLITE_ROW) fail(sqlite3_errcode(db_));
  return static_cast<std::uint64_t>(sqlite3_column_int64(all.at, 0));
}

std::uint64_t Store::rows_between(std::uint32_t run, std::uint64_t first, std::uint64_t last) const {
  sqlite3_bind_int64(count_, 1, run);
  sqlite3_bind_int64(count_, 2, static_cast<sqlite3_int64>(first));
  sqlite3_bind_int64(count_, 3, static_cast<sqlite3_int64>(last));
  const bool good = sqlite3_step(count_) == SQLITE_ROW;
  const auto rows = static_cast<std::uint64_t>(sqlite3_column_int64(count_, 0));
  sqlite3_reset(count_);
  if (!good) fail(sqlite3_errcode(db_));
  return rows;
}

void Store::each_row(const std::function<bool(const ResultRow&)>& visit) const {
  const Statement all(prepare("SELECT * FROM result ORDER BY \"case\", run"));
  int code = SQLITE_ROW;
  while ((code = sqlite3_step(all.at)) == SQLITE_ROW) {
    if (!visit(row_of(all.at))) return;
  }
  if (code != SQLITE_DONE) fail(code);
}

ResultRow Store::row_of(sqlite3_stmt* s) const {
  ResultRow row;
  row.case_number = static_cast<std::uint64_t>(sqlite3_column_int64(s, 0));
  row.run = static_cast<std::uint32_t>(sqlite3_column_int64(s, 1));
  row.status = text_at(s, 2);
  row.message = text_at(s, 3);
  int at = fixed;
  for (std::size_t i = 0; i < columns_.keys.size(); ++i) row.values.push_back(value_at(s, at++));
  for (std::size_t i = 0; i < columns_.figures.size(); ++i, ++at)
    row.figures.push_back(sqlite3_column_type(s, at) == SQLITE_NULL ? Figure() : Figure(sqlite3_column_double(s, at)));
  return row;
}

sqlite3_stmt* Store::prepare(const std::string& sql) const {
  sqlite3_stmt* statement = nullptr;
  const int code = sqlite3_prepare_v2(db_, sql.c_str(), -1, &statement, nullptr);
  if (code != SQLITE_OK) fail(code);
  return statement;
}

void Store::execute(const std::string& sql) const {
  const int code = sqlite3_exec(db_, sql.c_str(), nullptr, nullptr, nullptr);
  if (code != SQLITE_OK) fail(code);
}

}  // namespace slipbench
