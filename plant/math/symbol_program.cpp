// Program<Scalar>: inputs and outputs of a recording, and what of it the outputs need.
#include "plant/math/symbol.hpp"

namespace slipbench {

template <class S>
Symbol<S> Program<S>::input(const std::string& name, const std::string& array) {
  std::size_t element = 0;
  for (const auto& port : inputs_) element += port.array == array;
  const Symbol<S> x = input_at(array + "[" + std::to_string(element) + "]", name);
  inputs_.back().array = array, inputs_.back().element = element;
  return x;
}

template <class S>
Symbol<S> Program<S>::input_at(const std::string& place, const std::string& name) {
  const auto number = static_cast<std::uint32_t>(inputs_.size());
  const SymbolNode<S> node{graph_.get(), graph_->node({SymbolOp::input, number, 0, 0, S{}, false}), S{}, {}};
  graph_->label(name, node);
  inputs_.push_back({name, place, "", 0, node});
  return Symbol<S>(node);
}

template <class S>
void Program<S>::output(const std::string& name, const Symbol<S>& value, const std::string& array) {
  std::size_t element = 0;
  for (const auto& port : outputs_) element += port.array == array;
  output_at(array + "[" + std::to_string(element) + "]", name, value);
  outputs_.back().array = array, outputs_.back().element = element;
}

template <class S>
void Program<S>::output_at(const std::string& place, const std::string& name, const Symbol<S>& value) {
  outputs_.push_back({name, place, "", 0, value.node()});
}

template <class S>
std::vector<bool> Program<S>::needed() const {
  std::vector<bool> need(graph_->nodes.size(), false);
  for (const auto& port : outputs_) {
    if (port.node.graph) need[port.node.id] = true;
  }
  for (std::size_t i = need.size(); i-- > 0;) {
    const auto& n = graph_->nodes[i];
    const std::size_t count = need[i] ? operand_count(n.op) : 0;
    if (count > 0) need[n.a] = true;
    if (count > 1) need[n.b] = true;
    if (count > 2) need[n.c] = true;
  }
  return need;
}

template <class S>
std::map<SymbolOp, std::size_t> Program<S>::operation_counts() const {
  std::map<SymbolOp, std::size_t> counts;
  const auto need = needed();
  for (std::size_t i = 0; i < need.size(); ++i) {
    if (need[i]) ++counts[graph_->nodes[i].op];
  }
  return counts;
}

#define SLIPBENCH_PROGRAM(S)                                                                     \
  template Symbol<S> Program<S>::input(const std::string&, const std::string&);                  \
  template Symbol<S> Program<S>::input_at(const std::string&, const std::string&);               \
  template void Program<S>::output(const std::string&, const Symbol<S>&, const std::string&);    \
  template void Program<S>::output_at(const std::string&, const std::string&, const Symbol<S>&); \
  template std::vector<bool> Program<S>::needed() const;                                         \
  template std::map<SymbolOp, std::size_t> Program<S>::operation_counts() const;
SLIPBENCH_PROGRAM(float)
SLIPBENCH_PROGRAM(double)

}  // namespace slipbench
