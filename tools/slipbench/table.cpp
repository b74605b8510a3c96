#include "tools/slipbench/table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace slipbench {

namespace {

std::size_t width_of(const std::string& text) {  // code points: a continuation byte of UTF-8 takes no place
  return static_cast<std::size_t>(
      std::count_if(text.begin(), text.end(), [](char c) { return (static_cast<unsigned char>(c) & 0xC0u) != 0x80u; }));
}

int exponent_of(double number) {
  return number == 0.0 ? 0 : static_cast<int>(std::floor(std::log10(std::fabs(number))));
}

}  // namespace

void Table::column(std::string heading, std::string unit, Align align) {
  heads_.push_back({std::move(heading), std::move(unit), align});
}

void Table::row(std::vector<std::string> cells) {
  cells.resize(heads_.size());
  rows_.push_back(std::move(cells));
}

std::string Table::text() const {
  std::vector<std::vector<std::string>> lines(2);
  bool has_headings = false, has_units = false;
  for (const Head& head : heads_) {
    lines[0].push_back(head.heading);
    lines[1].push_back(head.unit);
    has_headings |= !head.heading.empty();
    has_units |= !head.unit.empty();
  }
  if (!has_units) lines.erase(lines.begin() + 1);
  if (!has_headings) lines.erase(lines.begin());
  lines.insert(lines.end(), rows_.begin(), rows_.end());
  std::vector<std::size_t> widths(heads_.size(), 0);
  for (const auto& line : lines) {
    for (std::size_t i = 0; i < heads_.size(); ++i) widths[i] = std::max(widths[i], width_of(line[i]));
  }
  std::string text;
  for (const auto& line : lines) {
    std::string out;
    for (std::size_t i = 0; i < heads_.size(); ++i) {
      const std::string gap(widths[i] - width_of(line[i]), ' ');
      out += "  " + (heads_[i].align == Align::left ? line[i] + gap : gap + line[i]);
    }
    out.erase(out.find_last_not_of(' ') + 1);
    text += out + "\n";
  }
  return text;
}

std::string significant(std::optional<double> number, int digits) {
  if (!number || std::isnan(*number)) return "-";
  if (std::isinf(*number)) return *number > 0 ? "inf" : "-inf";
  const int exponent = exponent_of(*number);
  if (*number != 0.0 && (exponent < -4 || exponent > 6)) return fmt::format("{:.{}e}", *number, digits - 1);
  std::string text = fmt::format("{:.{}f}", *number, std::clamp(digits - 1 - exponent, 0, 12));
  if (text.find_first_not_of("-0.") == std::string::npos) return "0";
  return text;
}

std::string plain(std::optional<double> number, int digits) {
  return number && !std::isnan(*number) ? fmt::format("{:.{}g}", *number, digits) : "-";
}

std::string plus_minus(double mean, double half_width) {
  if (!std::isfinite(mean) || !std::isfinite(half_width)) return significant(mean);
  const int of_mean = 3 - exponent_of(mean), of_half = -exponent_of(half_width);
  const int decimals = std::clamp(half_width > 0.0 ? std::min(of_half + 1, std::max(of_half, of_mean)) : of_mean, 0, 9);
  return fmt::format("{:.{}f} ± {:.{}f}", mean, decimals, half_width, decimals);
}

}  // namespace slipbench
