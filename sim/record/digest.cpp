#include "sim/record/digest.hpp"

#include <bit>
#include <cmath>

namespace slipbench {

void add_numbers(Sha256& sha, std::span<const double> numbers) {
  for (const double number : numbers) {
    const auto bits = std::isnan(number) ? std::uint64_t{0x7ff8000000000000} : std::bit_cast<std::uint64_t>(number);
    std::array<std::uint8_t, 8> bytes;
    for (std::size_t i = 0; i < 8; ++i) bytes[i] = static_cast<std::uint8_t>(bits >> (8 * i));
    sha.add(bytes);
  }
}

void RunDigest::begin(const RunInfo& info) {
  plant_ = Sha256{};
  estimators_.assign(info.estimator_names.size(), {});
}

void RunDigest::trace_row(const RowView& view) {
  add_numbers(plant_, *view.plant);
  for (std::size_t i = 0; i < estimators_.size(); ++i) {
    add_numbers(estimators_[i], view.estimates.subspan(i * estimator_column_count, estimator_column_count));
  }
}

}  // namespace slipbench
