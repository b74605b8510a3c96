// The store of a sweep: one SQLite file, format 1, WAL; what it was made from, and one row a case and run. The only place that knows
// SQLite.
//
//   about(item, content)   format, slipbench, plan, scenario, machines, overrides, seed, runs, cases
//   result("case", "run", status, message, KEY..., NAME.FIGURE...)   status: done | diverged | lost | refused; no timings
//
// A batch is one transaction: after kill -9 or on a full disk what was written stays, and no row is torn. SQLite's own tools read it.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "sim/score/figures.hpp"

struct sqlite3;
struct sqlite3_stmt;

namespace slipbench {

// What a store was made from, item by item; equal stores can be resumed and merged.
using Origin = std::vector<std::pair<std::string, std::string>>;

struct StoreColumns {
  std::vector<std::string> keys;     // varied, dotted
  std::vector<std::string> figures;  // "ekf.speed_rmse_rpm", "drive.load_dip_rpm"
};

struct ResultRow {
  std::uint64_t case_number = 0;
  std::uint32_t run = 0;
  std::string status, message;      // message: of what diverged or was refused, else ""
  std::vector<std::string> values;  // of the keys, as TOML
  std::vector<Figure> figures;
};

class Store {
 public:
  // Opens what is there or makes it. InputError: it was made from something else (says what changed); OutsideError: it can't be opened,
  // or another process is writing to it.
  Store(const std::string& path, const Origin& origin, const StoreColumns& columns);
  // Opens one for reading, whatever it was made from.
  explicit Store(const std::string& path);
  ~Store();
  Store(const Store&) = delete;
  Store& operator=(const Store&) = delete;

  void write(const std::vector<ResultRow>& batch);  // all or nothing; OutsideError
  [[nodiscard]] std::uint64_t rows() const;
  // How many rows of run `run` have first <= case < last.
  [[nodiscard]] std::uint64_t rows_between(std::uint32_t run, std::uint64_t first, std::uint64_t last) const;
  // Cases in order, runs in order within a case; false from `visit` stops.
  void each_row(const std::function<bool(const ResultRow&)>& visit) const;

  // store_queries.cpp (texts of errors: store_errors.cpp). Of one figure (its name): how many rows have it; the values at these ranks (0: the least) among them; the rows with
  // the largest, largest first. SQLite sorts, on disk where memory is short.
  [[nodiscard]] std::uint64_t figure_count(const std::string& figure) const;
  [[nodiscard]] std::vector<double> at_ranks(const std::string& figure, const std::vector<std::uint64_t>& ranks) const;
  [[nodiscard]] std::vector<ResultRow> largest(const std::string& figure, std::size_t rows) const;
  [[nodiscard]] std::uint64_t status_count(const std::string& status) const;
  // The values of these figures alone, a row at a time: cases in order, runs in order within a case.
  void each_figures(const std::vector<std::string>& figures,
                    const std::function<void(std::uint64_t case_number, const std::vector<Figure>& values)>& visit) const;

  // InputError that says what differs, where it was made from something else.
  void demand_same(const Origin& wanted) const;
  [[nodiscard]] const Origin& origin() const { return origin_; }
  [[nodiscard]] const StoreColumns& columns() const { return columns_; }
  [[nodiscard]] const std::string& path() const { return path_; }

 private:
  void open(bool writable);
  void open_as_it_stands();
  [[nodiscard]] bool beside_is_writable() const;
  [[nodiscard]] bool unfinished() const;  // rows wait in a WAL file
  void make();
  void read_origin();
  void execute(const std::string& sql) const;
  [[nodiscard]] sqlite3_stmt* prepare(const std::string& sql) const;
  [[noreturn]] void fail(int code) const;
  [[noreturn]] void undo_and_fail() const;
  [[noreturn]] void cannot_open(int system) const;
  [[nodiscard]] ResultRow row_of(sqlite3_stmt* statement) const;
  [[nodiscard]] std::uint64_t counted(const std::string& condition) const;

  std::string path_;
  Origin origin_;
  StoreColumns columns_;
  sqlite3* db_ = nullptr;
  sqlite3_stmt *insert_ = nullptr, *count_ = nullptr;
};

}  // namespace slipbench
