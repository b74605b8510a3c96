// What is asked of a finished store: counts, ranks and worst rows of a figure.
#include "sim/sweep/sqlite.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

std::uint64_t Store::counted(const std::string& condition) const {
  const Statement count(prepare("SELECT count(*) FROM result WHERE " + condition));
  if (sqlite3_step(count.at) != SQLITE_ROW) fail(sqlite3_errcode(db_));
  return static_cast<std::uint64_t>(sqlite3_column_int64(count.at, 0));
}

std::uint64_t Store::figure_count(const std::string& figure) const { return counted(quoted(figure) + " IS NOT NULL"); }

std::uint64_t Store::status_count(const std::string& status) const { return counted("status = '" + status + "'"); }

std::vector<double> Store::at_ranks(const std::string& figure, const std::vector<std::uint64_t>& ranks) const {
  // One sorted pass, in which the ranks are met one after the other.
  const std::string column = quoted(figure);
  const Statement sorted(
      prepare("SELECT " + column + " FROM result WHERE " + column + " IS NOT NULL ORDER BY " + column));
  std::vector<double> values(ranks.size());
  std::uint64_t last = 0;
  for (const std::uint64_t rank : ranks) last = rank > last ? rank : last;
  for (std::uint64_t at = 0; at <= last && sqlite3_step(sorted.at) == SQLITE_ROW; ++at) {
    for (std::size_t i = 0; i < ranks.size(); ++i) {
      if (ranks[i] == at) values[i] = sqlite3_column_double(sorted.at, 0);
    }
  }
  return values;
}

std::vector<ResultRow> Store::largest(const std::string& figure, std::size_t rows) const {
  const std::string column = quoted(figure);
  const Statement sorted(prepare("SELECT * FROM result WHERE " + column + " IS NOT NULL ORDER BY " + column +
                                 " DESC, \"case\", run LIMIT " + std::to_string(rows)));
  std::vector<ResultRow> found;
  while (sqlite3_step(sorted.at) == SQLITE_ROW) found.push_back(row_of(sorted.at));
  return found;
}

void Store::each_figures(
    const std::vector<std::string>& figures,
    const std::function<void(std::uint64_t case_number, const std::vector<Figure>& values)>& visit) const {
  std::string columns = "\"case\"";
  for (const std::string& figure : figures) columns += ", " + quoted(figure);
  const Statement all(prepare("SELECT " + columns + " FROM result ORDER BY \"case\", run"));
  std::vector<Figure> values(figures.size());
  int code = SQLITE_ROW;
  while ((code = sqlite3_step(all.at)) == SQLITE_ROW) {
    for (std::size_t i = 0; i < values.size(); ++i) {
      const int column = static_cast<int>(i) + 1;
      values[i] =
          sqlite3_column_type(all.at, column) == SQLITE_NULL ? Figure() : Figure(sqlite3_column_double(all.at, column));
    }
    visit(static_cast<std::uint64_t>(sqlite3_column_int64(all.at, 0)), values);
  }
  if (code != SQLITE_DONE) fail(code);
}

}  // namespace slipbench
