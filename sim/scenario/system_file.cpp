#include "sim/scenario/system_file.hpp"

#include <utility>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/matrix_node.hpp"
#include "sim/scenario/overrides.hpp"
#include "sim/scenario/system_design.hpp"

namespace slipbench {
namespace {

using linear::Matrix;
using linear::System;

// Without states the system is its feedthrough: B and C may be left out.
System static_system(const TableReader& t) {
  System s;
  s.D = read_matrix(t, "D", {}, {});
  for (const char* name : {"B", "C"}) {
    if (t.child(name) != nullptr) {
      const bool is_b = *name == 'B';
      const Matrix m = read_matrix(t, name, {}, {});
      if (m.size() != 0) t.wrong(*t.child(name), name, "an empty list, for A has no states", "shape");
      if (is_b && m.rows() != 0) t.wrong(*t.child(name), name, "an empty list, for A has no rows", "shape");
    }
  }
  s.A = Matrix(0, 0), s.B = Matrix(0, s.D.cols()), s.C = Matrix(s.D.rows(), 0);
  return s;
}

System matrices(const TableReader& t, Matrix& E) {
  const Node& a = t.need("A", "a square matrix as a list of rows, as in [[0.0, 1.0], [0.0, 0.0]]");
  const auto n = static_cast<Eigen::Index>(a.children.size());
  System s;
  s.A = read_matrix(t, "A", {}, {n, "for A is square"});
  if (n == 0) {
    if (t.child("E") != nullptr) t.wrong(*t.child("E"), "E", "none, for A has no rows", "shape");
    return static_system(t);
  }
  s.B = read_matrix(t, "B", {n, "as A has"}, {});
  s.C = read_matrix(t, "C", {}, {n, "as A has"});
  s.D = t.child("D") == nullptr ? Matrix::Zero(s.C.rows(), s.B.cols())
                                : read_matrix(t, "D", {s.C.rows(), "as C has"}, {s.B.cols(), "as B has"});
  if (t.child("E") != nullptr) E = read_matrix(t, "E", {n, "as A has"}, {n, "as A has"});
  return s;
}

void read_system(SystemFile& file, const Node& node) {
  const TableReader t(node, "system", {"A", "B", "C", "D", "E", "sample_period_s", "states", "inputs", "outputs"});
  file.place = node.place.text();
  System s = matrices(t, file.E);
  if (t.child("sample_period_s") != nullptr) {
    s.sample_period_s = t.number("sample_period_s");
    if (!(s.sample_period_s > 0.0) || s.sample_period_s > 1e6)
      t.wrong(*t.child("sample_period_s"), "sample_period_s",
              "a number above 0, at most 1e+06; a continuous system has no such key", "range");
  }
  if (t.child("states") != nullptr) s.state_names = read_names(t, "states", {s.order(), "one a row of A"});
  if (t.child("inputs") != nullptr) s.input_names = read_names(t, "inputs", {s.inputs(), "one a column of B"});
  if (t.child("outputs") != nullptr) s.output_names = read_names(t, "outputs", {s.outputs(), "one a row of C"});
  try {
    file.system = linear::checked(std::move(s));
    if (file.E.size() == 0) return;
    linear::Reduced reduced = linear::reduce(file.E, file.system);
    file.system = std::move(reduced.system);
    file.redundant = std::move(reduced.redundant);
  } catch (const linear::LinearError& error) {
    const Node* at = t.child("E");
    refuse(at != nullptr ? at->place : node.place, at != nullptr ? "system.E" : "system", error.what(), "linear");
  }
}

SystemFile file_of(Node root, const std::vector<Override>& overrides) {
  apply_overrides(root, overrides);
  const Node* system = root.child("system");
  if (system == nullptr)
    refuse({root.place.file, 1, 1}, "system", "missing table [system]: this is no state-space file", "missing");
  const TableReader t(root, "", {"format", "title", "source", "system", "design"});
  SystemFile file;
  if (t.child("format") != nullptr) (void)t.whole("format", 1, 1);
  if (t.child("title") != nullptr) file.title = t.word("title", {});
  if (t.child("source") != nullptr) file.source = t.word("source", {});
  read_system(file, *system);
  if (const Node* design = t.child("design")) file.design = read_design(*design, file.system);
  return file;
}

}  // namespace

SystemFile read_system_file(const std::string& path, const std::vector<Override>& overrides) {
  std::string why;
  const auto text = read_text(path, why);
  if (!text) throw InputError(path, "", why, "file");
  SystemFile file = read_system_text(*text, path, overrides);
  file.path = path;
  return file;
}

SystemFile read_system_text(const std::string& text, const std::string& name, const std::vector<Override>& overrides) {
  return file_of(parse_toml(text, name), overrides);
}

}  // namespace slipbench
