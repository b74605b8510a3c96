// Plain text tables for people: a line of headings, a line of units, right-aligned numbers with few significant digits.
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace slipbench {

class Table {
 public:
  enum class Align { left, right };
  void column(std::string heading, std::string unit, Align align = Align::right);
  void row(std::vector<std::string> cells);
  [[nodiscard]] std::string text() const;  // two spaces before each line and between columns

 private:
  struct Head {
    std::string heading, unit;
    Align align;
  };
  std::vector<Head> heads_;
  std::vector<std::vector<std::string>> rows_;
};

// A number with `digits` significant digits, no exponent between 1e-4 and 1e7; "-" for none.
std::string significant(std::optional<double> number, int digits = 4);
// A given number as it was given, more or less: up to `digits` significant digits without trailing zeros; "-" for none.
std::string plain(std::optional<double> number, int digits = 6);
// "3.214 ± 0.051": as many decimals as show two digits of the half width, or one where the mean has four without.
std::string plus_minus(double mean, double half_width);

}  // namespace slipbench
