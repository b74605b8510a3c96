#include "sim/scenario/matrix_node.hpp"

#include <algorithm>
#include <cmath>

#include "sim/scenario/fill.hpp"

namespace slipbench {
namespace {

using linear::Complex;
using linear::Matrix;

std::string counted(Eigen::Index count, const char* thing) {
  return std::to_string(count) + " " + thing + (count == 1 ? "" : "s");
}

std::string element(std::string_view name, std::size_t i) { return std::string(name) + "." + std::to_string(i); }

double read_element(const TableReader& t, const Node& at, const std::string& name) {
  if (!at.is_number()) t.wrong(at, name, "a number");
  const double x = at.number();
  if (!std::isfinite(x)) t.wrong(at, name, "a finite number, never NaN or infinity", "range");
  if (std::fabs(x) > largest_element) t.wrong(at, name, "a number of at most 1e+100 in magnitude", "range");
  return x;
}

const Node& list(const TableReader& t, std::string_view name, const std::string& wanted) {
  const Node& at = t.need(name, wanted);
  if (at.kind != Node::Kind::array) t.wrong(at, name, wanted);
  return at;
}

[[noreturn]] void misfit(const TableReader& t, const Node& at, std::string_view name, Eigen::Index found,
                         const char* thing, const Side& wanted) {
  refuse(at.place, t.dotted(name),
         "'" + t.dotted(name) + "' has " + counted(found, thing) + "; wanted " + (wanted.length == 1 ? "is " : "are ") +
             std::to_string(wanted.length) + (wanted.why.empty() ? "" : ", " + wanted.why),
         "shape");
}

void want_count(const TableReader& t, const Node& at, std::string_view name, Eigen::Index found, const char* thing,
                const Side& wanted) {
  if (wanted.length >= 0 && found != wanted.length) misfit(t, at, name, found, thing, wanted);
  if (found > largest_order)
    refuse(at.place, t.dotted(name),
           "'" + t.dotted(name) + "' has " + counted(found, thing) + "; allowed are at most " +
               std::to_string(largest_order),
           "range");
}

}  // namespace

Matrix read_matrix(const TableReader& t, std::string_view name, const Side& rows, const Side& columns) {
  const char* form = "a matrix as a list of rows, as in [[1.0, 0.0], [0.0, 1.0]]";
  const Node& at = list(t, name, form);
  const auto row_count = static_cast<Eigen::Index>(at.children.size());
  for (const Node& row : at.children) {
    if (row.kind != Node::Kind::array)
      t.wrong(row, element(name, static_cast<std::size_t>(&row - at.children.data())),
              "a row of numbers: " + t.dotted(name) + " is " + form);
  }
  want_count(t, at, name, row_count, "row", rows);
  const Eigen::Index width = row_count == 0 ? std::max<Eigen::Index>(columns.length, 0)
                                            : static_cast<Eigen::Index>(at.children.front().children.size());
  if (row_count > 0) want_count(t, at, name, width, "column", columns);
  Matrix m(row_count, width);
  for (std::size_t i = 0; i < at.children.size(); ++i) {
    const Node& row = at.children[i];
    const std::string row_name = element(name, i);
    if (static_cast<Eigen::Index>(row.children.size()) != width)
      refuse(row.place, t.dotted(row_name),
             "'" + t.dotted(row_name) + "' is " + found_text(row) + "; wanted is a row of " + counted(width, "number") +
                 ", as the first row is",
             "shape");
    for (std::size_t j = 0; j < row.children.size(); ++j)
      m(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j)) =
          read_element(t, row.children[j], element(row_name, j));
  }
  return m;
}

Matrix read_symmetric(const TableReader& t, std::string_view name, const Side& side) {
  const Matrix m = read_matrix(t, name, side, side);
  for (Eigen::Index i = 0; i < m.rows(); ++i) {
    for (Eigen::Index j = 0; j < i; ++j) {
      if (m(i, j) == m(j, i)) continue;
      const std::string lower = element(element(name, static_cast<std::size_t>(i)), static_cast<std::size_t>(j)),
                        upper = element(element(name, static_cast<std::size_t>(j)), static_cast<std::size_t>(i));
      const Node& at = t.child(name)->children[static_cast<std::size_t>(i)].children[static_cast<std::size_t>(j)];
      t.wrong(at, lower, number_text(m(j, i)) + ", as " + t.dotted(upper) + " is: the matrix must be symmetric",
              "relation");
    }
  }
  return m;
}

std::vector<Complex> read_poles(const TableReader& t, std::string_view name, const Side& count) {
  const Node& at = list(t, name, "a list of poles, each [re, im], as in [[-2.0, 4.0], [-2.0, -4.0], [-10.0, 0.0]]");
  std::vector<Complex> poles;
  for (std::size_t i = 0; i < at.children.size(); ++i) {
    const Node& one = at.children[i];
    const std::string its = element(name, i);
    if (one.is_number()) {
      poles.emplace_back(read_element(t, one, its), 0.0);
    } else if (one.kind == Node::Kind::array && one.children.size() == 2) {
      const double re = read_element(t, one.children[0], element(its, 0));
      poles.emplace_back(re, read_element(t, one.children[1], element(its, 1)) + 0.0);
    } else {
      t.wrong(one, its, "a pole: [re, im], or a number for a real one");
    }
  }
  want_count(t, at, name, static_cast<Eigen::Index>(poles.size()), "pole", count);
  for (std::size_t i = 0; i < poles.size(); ++i) {
    if (poles[i].imag() == 0.0) continue;
    if (std::count(poles.begin(), poles.end(), std::conj(poles[i])) == std::count(poles.begin(), poles.end(), poles[i]))
      continue;
    refuse(at.children[i].place, t.dotted(element(name, i)),
           "'" + t.dotted(element(name, i)) + "' is " + linear::text_of(poles[i]) +
               "; wanted beside it is its conjugate, " + linear::text_of(std::conj(poles[i])) +
               ", as often: a real system has poles in such pairs",
           "relation");
  }
  return poles;
}

std::vector<std::string> read_names(const TableReader& t, std::string_view name, const Side& count) {
  const Node& at = list(t, name, "a list of strings");
  std::vector<std::string> names;
  for (std::size_t i = 0; i < at.children.size(); ++i) {
    const Node& one = at.children[i];
    if (one.kind != Node::Kind::text || one.text.empty() || one.text.size() > 60 || printable(one.text) != one.text)
      t.wrong(one, element(name, i), "a name: a string of 1 to 60 printable characters");
    if (std::count(names.begin(), names.end(), one.text) > 0)
      t.wrong(one, element(name, i), "a name that is not there yet", "relation");
    names.push_back(one.text);
  }
  want_count(t, at, name, static_cast<Eigen::Index>(names.size()), "name", count);
  return names;
}

}  // namespace slipbench
