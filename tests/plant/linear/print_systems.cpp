// Prints random systems and what the library makes of them, one JSON object a line, for another library to judge.
//
//     print_systems SEED COUNT
//
// Matrices are [rows, columns, numbers by rows...]. Orders 2 to 12, every other system discrete, every third with parts
// that can't be reached or seen, whose sizes ("parts": co, c, o, n) hold by construction: block form, then a
// well-conditioned change of states.
#include <cstdio>
#include <cstdlib>
#include <random>

#include "plant/linear/decomposition.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/discretise.hpp"
#include "plant/linear/gramians.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/pbh.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/staircase.hpp"
#include "plant/linear/zeros.hpp"

using namespace slipbench::linear;

namespace {

std::mt19937_64 source;

double uniform() { return 2.0 * (static_cast<double>(source() >> 11) * 0x1p-53) - 1.0; }
int whole(int from, int to) { return from + static_cast<int>(source() % static_cast<unsigned>(to - from + 1)); }

Matrix random_matrix(Eigen::Index rows, Eigen::Index columns) {
  return Matrix::NullaryExpr(rows, columns, [](Eigen::Index) { return uniform(); });
}

// Four reflections and a stretch of 1/2 to 2; its inverse is made alongside.
void change_states(System* s) {
  const auto n = s->order();
  for (int k = 0; k < 4; ++k) {
    const Vector v = random_matrix(n, 1).col(0).normalized();
    const Matrix h = Matrix::Identity(n, n) - 2.0 * v * v.transpose();
    Vector stretch = Vector::Ones(n);
    if (k == 2)
      for (auto& x : stretch) x = 1.25 + 0.75 * uniform();
    s->A = stretch.asDiagonal() * h * s->A * h * stretch.cwiseInverse().asDiagonal();
    s->B = stretch.asDiagonal() * h * s->B;
    s->C = s->C * h * stretch.cwiseInverse().asDiagonal();
  }
}

System random_system(int at, int (&part)[4]) {
  const int n = whole(2, 12), m = whole(1, 3), p = whole(1, 3);
  for (int& size : part) size = 0;
  part[0] = n;
  if (at % 3 == 0)
    for (int k = 1; k < 4; ++k) {
      part[k] = whole(0, std::min(2, part[0]));
      part[0] -= part[k];
    }
  System s;
  s.sample_period_s = at % 2 ? 0.1 : 0.0;
  s.A = random_matrix(n, n);
  s.B = random_matrix(n, m);
  s.C = random_matrix(p, n);
  s.D = whole(0, 1) ? random_matrix(p, m) : Matrix::Zero(p, m);
  const int start[] = {0, part[0], part[0] + part[1], part[0] + part[1] + part[2]};
  static constexpr bool zero[4][4] = {{0, 1, 0, 1}, {0, 0, 0, 0}, {1, 1, 0, 1}, {1, 1, 0, 0}};
  for (int i = 0; i < 4; ++i) {
    for (int j = 0; j < 4; ++j)
      if (zero[i][j]) s.A.block(start[i], start[j], part[i], part[j]).setZero();
    if (i >= 2) s.B.middleRows(start[i], part[i]).setZero();
    if (i % 2) s.C.middleCols(start[i], part[i]).setZero();
  }
  // Entries of variance 1/3 have poles out to sqrt(n / 3): inside the circle, or mostly left of the axis.
  const double radius = std::sqrt(n / 3.0);
  if (s.discrete())
    s.A *= 0.8 / radius;
  else
    s.A.diagonal().array() -= (at % 5 == 0 ? 0.5 : 1.2) * radius;
  change_states(&s);
  return s;
}

void print(const char* key, const Matrix& m) {
  std::printf(",\"%s\":[%d,%d", key, static_cast<int>(m.rows()), static_cast<int>(m.cols()));
  for (Eigen::Index i = 0; i < m.rows(); ++i)
    for (Eigen::Index j = 0; j < m.cols(); ++j) std::printf(",%.17g", m(i, j));
  std::printf("]");
}

void print(const char* key, const std::vector<Complex>& values) {
  Matrix m(static_cast<Eigen::Index>(values.size()), 2);
  for (Eigen::Index i = 0; i < m.rows(); ++i) {
    m(i, 0) = values[static_cast<std::size_t>(i)].real();
    m(i, 1) = values[static_cast<std::size_t>(i)].imag();
  }
  print(key, m);
}

void print(const std::string& name, const System& s) {
  print((name + "_A").c_str(), s.A);
  print((name + "_B").c_str(), s.B);
  print((name + "_C").c_str(), s.C);
  print((name + "_D").c_str(), s.D);
}

void judge(int at) {
  int part[4];
  const System s = random_system(at, part);
  std::printf("{\"at\":%d,\"period_s\":%.17g,\"parts\":[%d,%d,%d,%d]", at, s.sample_period_s, part[0], part[1], part[2],
              part[3]);
  print("given", s);
  std::vector<Complex> poles;
  for (const Mode& mode : modes_of(s)) poles.push_back(mode.pole);
  print("poles", poles);
  std::printf(",\"stability\":\"%s\"", name_of(stability_of(s).stability));
  const Ranks ranks = ranks_of(s);
  std::printf(",\"ranks\":[%d,%d]", static_cast<int>(ranks.controllable), static_cast<int>(ranks.observable));
  const auto tests = pbh(s);
  Matrix table(static_cast<Eigen::Index>(tests.size()), 2);
  for (Eigen::Index i = 0; i < table.rows(); ++i)
    table.row(i) << tests[static_cast<std::size_t>(i)].controllable, tests[static_cast<std::size_t>(i)].observable;
  print("pbh", table);
  std::printf(",\"stabilisable\":%d,\"detectable\":%d", stabilisable(s), detectable(s));
  print("invariant_zeros", invariant_zeros(s));
  print("transmission_zeros", transmission_zeros(s));
  print("dc_gain", dc_gain(s));
  print("minimal", minimal(s).system);
  const KalmanForm form = kalman_form(s);
  std::printf(",\"found\":[%d,%d,%d,%d]", static_cast<int>(form.controllable_observable),
              static_cast<int>(form.controllable_only), static_cast<int>(form.observable_only),
              static_cast<int>(form.neither));
  print("kalman", form.system);
  print("kalman_T", form.T);
  const Modal modal = modal_form(s);
  print("modal", modal.system);
  print("modal_T", modal.T);
  if (stability_of(s).stability == Stability::stable) {
    const Gramians w = gramians(s);
    print("Wc", w.controllability);
    print("Wo", w.observability);
    const Minimal small = balanced(s);
    print("balanced", small.system);
    print("hankel", Matrix(small.hankel));
  }
  if (!s.discrete())
    for (const auto method : {Discretisation::zero_order_hold, Discretisation::euler, Discretisation::tustin})
      print(name_of(method), discretise(s, 0.05, method));
  std::printf("}\n");
}

}  // namespace

int main(int count, char** words) {
  if (count != 3) {
    std::fprintf(stderr, "usage: print_systems SEED COUNT\n");
    return 2;
  }
  source.seed(std::strtoull(words[1], nullptr, 10));
  for (int at = 0; at < std::atoi(words[2]); ++at) judge(at);
}
