// Matrices, poles and names as a file holds them: lists of rows, of [re, im], of strings; every refusal names the element.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "plant/linear/system.hpp"
#include "sim/scenario/table_reader.hpp"

namespace slipbench {

// Largest order and largest number of inputs or outputs: dense methods of third and fourth order in it stay in seconds.
inline constexpr Eigen::Index largest_order = 60;
// Largest magnitude of an element: its square, and sums of such, stay finite.
inline constexpr double largest_element = 1e100;

// A side of a matrix that must fit another: `length` < 0: any. `why`, as in "as A has".
struct Side {
  Eigen::Index length = -1;
  std::string why;
};

// InputError unless `name` is a list of equally long rows of finite numbers, of that many rows and columns.
linear::Matrix read_matrix(const TableReader& table, std::string_view name, const Side& rows, const Side& columns);
// The same, square and symmetric to the bit.
linear::Matrix read_symmetric(const TableReader& table, std::string_view name, const Side& side);
// [re, im] pairs, or plain numbers for real ones; complex ones together with their conjugates. `count` < 0: any number.
std::vector<linear::Complex> read_poles(const TableReader& table, std::string_view name, const Side& count);
// Strings, one each, none empty, none twice.
std::vector<std::string> read_names(const TableReader& table, std::string_view name, const Side& count);

}  // namespace slipbench
