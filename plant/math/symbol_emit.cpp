// Program<Scalar>::emit_c: the recorded graph as one straight-line C99 function over arrays.
#include <algorithm>
#include <sstream>

#include "plant/math/symbol_text.hpp"

namespace slipbench {

template <class S>
std::string Program<S>::emit_c(const std::string& function_name) const {
  struct Array {
    std::string name;
    std::size_t size = 0;
    bool written = false, used = false;
  };
  const std::vector<bool> need = needed();
  std::vector<Array> arrays;
  const auto declare = [&](const Port& port, bool written) {
    Array* array = nullptr;
    for (auto& known : arrays) array = known.name == port.array ? &known : array;
    if (!array) array = &arrays.emplace_back(Array{port.array});
    array->size = std::max(array->size, port.element + 1);
    array->written = array->written || written;
    array->used = array->used || written || need[port.node.id];
  };
  for (const auto& port : inputs_) declare(port, false);
  for (const auto& port : outputs_) declare(port, true);

  std::set<std::string> taken{function_name};
  for (const Array& array : arrays) taken.insert(array.name);
  const std::string prefix = "slipbench_";
  const Body<S> body = body_of(*this, taken, Constants::inlined, prefix);
  const OperationCount& o = body.operations;

  std::ostringstream out;
  out << "/* " << function_name << ": straight-line C99 in " << c_type<S>() << ", written by slipbench.\n"
      << " * " << o.multiply << " multiplications, " << o.add << " additions and subtractions, " << o.divide
      << " divisions, " << o.root << " square roots, " << o.compare << " comparisons, " << o.choose << " choices.\n"
      << " * Its bits are those of the simulation under IEEE 754 arithmetic, rounding to nearest, subnormals kept, and "
         "these flags:\n"
      << " *   -std=c99 -ffp-contract=off   (no -ffast-math, no -funsafe-math-optimizations, FLT_EVAL_METHOD 0)\n"
      << " * Every input is read before any output is written, so arrays may be the same memory. */\n"
      << "#include <math.h>\n#include <stdint.h>\n\n"
      << helper_functions<S>(body.helpers, prefix);
  std::string signature = "void " + function_name + "(";
  for (std::size_t i = 0; i < arrays.size(); ++i) {
    signature += (i ? ", " : "") + std::string(arrays[i].written ? "" : "const ") + c_type<S>() + " " + arrays[i].name +
                 "[" + std::to_string(arrays[i].size) + "]";
  }
  signature += arrays.empty() ? "void)" : ")";
  out << signature << ";\n\n" << signature << " {\n";
  for (const Array& array : arrays) {
    if (!array.used) out << "  (void)" << array.name << ";\n";
  }
  out << body.statements << "}\n";
  return out.str();
}

template std::string Program<float>::emit_c(const std::string&) const;
template std::string Program<double>::emit_c(const std::string&) const;

}  // namespace slipbench
