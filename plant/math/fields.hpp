// SLIPBENCH_FIELDS(a, b, c): lists the number fields of a plain struct once, so that states and constants can be
// converted between number types, packed into lanes, checked for finite values and named in exported C.
//
//   template <class Real> struct Pair { Real low, high; SLIPBENCH_FIELDS(low, high) };
//
// A field may itself be such a struct, a Real, or a std::array of either. `each_number(self, f)` calls f(name, number&)
// for every number inside, depth first, in the order written; names join with '_', array elements append their index.
#pragma once

#include <array>
#include <cstddef>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#define SLIPBENCH_PARENS ()
#define SLIPBENCH_EXPAND(...) SLIPBENCH_EXPAND3(SLIPBENCH_EXPAND3(SLIPBENCH_EXPAND3(__VA_ARGS__)))
#define SLIPBENCH_EXPAND3(...) SLIPBENCH_EXPAND2(SLIPBENCH_EXPAND2(SLIPBENCH_EXPAND2(__VA_ARGS__)))
#define SLIPBENCH_EXPAND2(...) SLIPBENCH_EXPAND1(SLIPBENCH_EXPAND1(SLIPBENCH_EXPAND1(__VA_ARGS__)))
#define SLIPBENCH_EXPAND1(...) __VA_ARGS__
#define SLIPBENCH_EACH(...) __VA_OPT__(SLIPBENCH_EXPAND(SLIPBENCH_EACH_ONE(__VA_ARGS__)))
#define SLIPBENCH_EACH_ONE(field, ...) \
  visit(#field, self.field);           \
  __VA_OPT__(SLIPBENCH_EACH_AGAIN SLIPBENCH_PARENS(__VA_ARGS__))
#define SLIPBENCH_EACH_AGAIN() SLIPBENCH_EACH_ONE

#define SLIPBENCH_FIELDS(...)                                 \
  template <class Self, class Visit>                          \
  static constexpr void each_field(Self& self, Visit visit) { \
    SLIPBENCH_EACH(__VA_ARGS__)                               \
  }

namespace slipbench {

namespace detail {
struct Nothing {
  template <class T>
  void operator()(const char*, T&) const {}
};
template <class T>
struct IsArray : std::false_type {};
template <class T, std::size_t N>
struct IsArray<std::array<T, N>> : std::true_type {};
}  // namespace detail

template <class T>
concept FieldStruct = requires(T& t) {
  std::remove_const_t<T>::each_field(t, detail::Nothing{});
};

// Calls f(number&) for every number in `item`, in written order.
template <class Item, class F>
constexpr void each_number(Item& item, F&& f) {
  if constexpr (detail::IsArray<std::remove_const_t<Item>>::value) {
    for (auto& element : item) each_number(element, f);
  } else if constexpr (FieldStruct<Item>) {
    std::remove_const_t<Item>::each_field(item, [&](const char*, auto& inner) { each_number(inner, f); });
  } else {
    f(item);
  }
}

// Calls f(std::string name, number&) likewise; outside the control tick only.
template <class Item, class F>
void each_named(const std::string& name, Item& item, F&& f) {
  if constexpr (detail::IsArray<std::remove_const_t<Item>>::value) {
    std::size_t index = 0;
    for (auto& element : item) each_named(name + std::to_string(index++), element, f);
  } else if constexpr (FieldStruct<Item>) {
    std::remove_const_t<Item>::each_field(item, [&](const char* field, auto& inner) {
      each_named(name.empty() ? std::string(field) : name + "_" + field, inner, f);
    });
  } else {
    f(name, item);
  }
}

// Pointers to every number of `item`, in written order; `Number` is their (possibly const) type. Outside the tick only.
template <class Number, class Item>
std::vector<Number*> numbers_of(Item& item) {
  std::vector<Number*> all;
  each_number(item, [&](auto& x) { all.push_back(&x); });
  return all;
}

// Converts a struct of one number type to the same struct of another, number by number: `change(from) -> to`.
//   auto single = convert_to<Model<float>, float>(model_in_double, [](double x) { return float(x); });
template <class To, class ToNumber, class FromNumber = double, class From, class Change>
To convert_to(const From& from, Change change) {
  To to{};
  const auto sources = numbers_of<const FromNumber>(from);
  const auto targets = numbers_of<ToNumber>(to);
  for (std::size_t i = 0; i < targets.size(); ++i) *targets[i] = change(*sources[i]);
  return to;
}

// Constants are prepared in double and handed to a step in its own number type.
template <class To, class ToNumber, class From>
To in_number(const From& from) {
  return convert_to<To, ToNumber, double>(from, [](double x) { return ToNumber(x); });
}

}  // namespace slipbench
