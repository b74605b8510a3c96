// A method's step written down with this scenario's constants and first state, and a replay of the same step in C++.
//
// Numbers of the state that never change from their first value are constants of the exported code, and numbers that are
// always equal (a covariance matrix's two halves) are one. That is found by assuming it of all numbers that begin alike and
// taking back what a recording refutes, until one refutes nothing: true by induction over the ticks, from `begin` on.
#pragma once

#include <bit>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "plant/math/symbol.hpp"
#include "sim/engine/setup.hpp"
#include "sim/export/door.hpp"

namespace slipbench {

// The step as the simulation computes it, from `begin` on; numbers in the order of each_number.
template <class S>
class Replay {
 public:
  virtual ~Replay() = default;
  virtual std::vector<S> step(std::span<const double> seen) = 0;
  [[nodiscard]] virtual std::vector<S> state() const = 0;
};

template <class S>
struct RecordedStep {
  Program<S> program;
  std::string_view in_name, out_name;
  std::vector<DoorField> in, out;           // members of the C structs
  std::vector<bool> in_read;                // of `in`: whether the step reads it
  std::vector<std::size_t> kept, answered;  // which numbers of the state and of the answer are members
  std::vector<std::string> state;           // names of those kept
  std::vector<S> begin;                     // their first values
  std::vector<std::pair<std::string, double>> constants;
  std::string_view state_note;  // what the method says of its state's units; may be empty
  std::unique_ptr<Replay<S>> replay;
};

namespace detail {

template <class S, class Method, class Door>
class MethodReplay final : public Replay<S> {
 public:
  explicit MethodReplay(const MethodNumbers& numbers) {
    std::size_t n = 0;
    each_number(constants_, [&](S& x) { x = static_cast<S>(numbers.constants[n++]); });
    n = 0;
    each_number(state_, [&](S& x) { x = static_cast<S>(numbers.state[n++]); });
  }
  std::vector<S> step(std::span<const double> seen) override {
    typename Door::template In<S> in;
    std::size_t n = 0;
    each_number(in, [&](S& x) { x = static_cast<S>(seen[n++]); });
    const typename Door::template Out<S> out = Method::template step<S>(state_, in, constants_);
    std::vector<S> all;
    each_number(out, [&](const S& x) { all.push_back(x); });
    return all;
  }
  [[nodiscard]] std::vector<S> state() const override {
    std::vector<S> all;
    each_number(state_, [&](const S& x) { all.push_back(x); });
    return all;
  }

 private:
  typename Method::template Constants<S> constants_;
  typename Method::template State<S> state_;
};

// Which numbers of a state are taken as one, and which as never changing.
struct Alike {
  std::vector<std::size_t> group;  // of each number
  std::vector<bool> constant;      // of each group
  bool operator==(const Alike&) const = default;
};

// Groups by `key`, numbered in order of appearance; constant where `stays` says so of the first member.
template <class Key>
Alike grouped(const std::vector<Key>& keys, const std::vector<bool>& stays) {
  Alike all;
  std::vector<Key> known;
  for (std::size_t i = 0; i < keys.size(); ++i) {
    std::size_t at = 0;
    while (at < known.size() && !(known[at] == keys[i])) ++at;
    if (at == known.size()) known.push_back(keys[i]), all.constant.push_back(stays[i]);
    all.group.push_back(at);
  }
  return all;
}

// Nodes that these results hang on.
template <class S>
std::vector<bool> reached(const Graph<S>& graph, const std::vector<Symbol<S>>& roots) {
  std::vector<bool> all(graph.nodes.size(), false);
  for (const Symbol<S>& root : roots) {
    if (!root.is_constant()) all[root.node().id] = true;
  }
  for (std::size_t i = all.size(); i-- > 0;) {
    const auto& n = graph.nodes[i];
    const std::uint32_t operands[] = {n.a, n.b, n.c};
    for (std::size_t k = 0; all[i] && k < operand_count(n.op); ++k) all[operands[k]] = true;
  }
  return all;
}

}  // namespace detail

template <class S, class Method, class Door>
RecordedStep<S> record_step(const MethodNumbers& numbers) {
  using R = Symbol<S>;
  using Bits = std::conditional_t<sizeof(S) == 8, std::uint64_t, std::uint32_t>;
  const auto bits = [](S x) { return std::uint64_t{std::bit_cast<Bits>(x)}; };
  RecordedStep<S> r;
  r.in_name = Door::in_name, r.out_name = Door::out_name;
  r.in.assign(Door::in.begin(), Door::in.end());
  if constexpr (requires { Method::state_note; }) r.state_note = Method::state_note;

  typename Method::template Constants<R> constants;
  std::size_t at = 0;
  each_named(std::string(), constants, [&](const std::string& name, R& x) {
    r.constants.emplace_back(name, numbers.constants[at]);
    x = R::named(numbers.constants[at++], name);
  });
  std::vector<S> begin;
  for (const double x : numbers.state) begin.push_back(static_cast<S>(x));
  std::vector<std::uint64_t> first_bits;
  for (const S x : begin) first_bits.push_back(bits(x));

  for (detail::Alike alike = detail::grouped(first_bits, std::vector<bool>(begin.size(), true));;) {
    Program<S> program;
    const typename Program<S>::Listening listening(program);
    typename Method::template State<R> state;
    std::vector<R> of_group(alike.constant.size());
    std::vector<bool> read(alike.constant.size(), false);
    std::vector<std::string> names;
    std::vector<std::size_t> kept;
    each_named(std::string(), state, [&](const std::string& name, R& x) {
      const std::size_t i = names.size(), g = alike.group[i];
      names.push_back(name);
      if (!read[g]) {
        read[g] = true;
        if (!alike.constant[g]) kept.push_back(i);
        of_group[g] =
            alike.constant[g] ? R(static_cast<double>(begin[i])) : program.input_at("state->" + name, name + "_before");
      }
      x = of_group[g];
    });
    typename Door::template In<R> in;
    std::size_t field = 0;
    const std::string in_place = std::string(Door::in_name) + "->", out_place = std::string(Door::out_name) + "->";
    std::vector<SymbolNode<S>> in_nodes;
    each_number(in, [&](R& x) {
      const DoorField& f = Door::in[field++];
      x = program.input_at(in_place + std::string(f.member), std::string(f.local));
      in_nodes.push_back(x.node());
    });
    const typename Door::template Out<R> out = Method::template step<R>(state, in, constants);

    // What each number has become, beside what it was taken for.
    std::vector<std::array<std::uint64_t, 3>> keys;
    std::vector<bool> stays;
    std::vector<R> after;
    each_number(state, [&](const R& x) {
      const std::size_t i = after.size();
      const SymbolNode<S>& n = x.node();
      after.push_back(x);
      stays.push_back(alike.constant[alike.group[i]] && x.is_constant() && bits(x.value()) == first_bits[i]);
      keys.push_back({alike.group[i], std::uint64_t{x.is_constant()}, x.is_constant() ? bits(x.value()) : n.id});
    });
    if (detail::Alike now = detail::grouped(keys, stays); now != alike) {
      alike = std::move(now);
      continue;
    }

    // Numbers that nobody will read, not even through others of the state, are not kept.
    std::vector<R> answer;
    each_number(out, [&](const R& x) { answer.push_back(x); });
    std::vector<bool> lives(kept.size(), false);
    for (bool grown = true; grown;) {
      grown = false;
      std::vector<R> roots = answer;
      for (std::size_t j = 0; j < kept.size(); ++j) {
        if (lives[j]) roots.push_back(after[kept[j]]);
      }
      const std::vector<bool> reached = detail::reached(program.graph(), roots);
      for (std::size_t j = 0; j < kept.size(); ++j) {
        if (lives[j] || !reached[of_group[alike.group[kept[j]]].node().id]) continue;
        lives[j] = grown = true;
      }
    }
    for (std::size_t j = kept.size(); j-- > 0;) {
      if (!lives[j]) kept.erase(kept.begin() + static_cast<std::ptrdiff_t>(j));
    }
    for (const std::size_t i : kept) {
      program.output_at("state->" + names[i], names[i], after[i]);
      r.state.push_back(names[i]);
      r.begin.push_back(begin[i]);
    }
    r.kept = std::move(kept);
    bool without_covariance = false;
    for (std::size_t i = 0; i < answer.size(); ++i) {
      if (Door::out[i].member == "has_covariance")
        without_covariance = answer[i].is_constant() && answer[i].value() == S(0);
      if (without_covariance) continue;
      program.output_at(out_place + std::string(Door::out[i].member), std::string(Door::out[i].local), answer[i]);
      r.out.push_back(Door::out[i]);
      r.answered.push_back(i);
    }
    const std::vector<bool> needed = program.needed();
    for (const SymbolNode<S>& n : in_nodes) r.in_read.push_back(needed[n.id]);
    r.program = std::move(program);
    r.replay = std::make_unique<detail::MethodReplay<S, Method, Door>>(numbers);
    return r;
  }
}

}  // namespace slipbench
