// Numbers and tables as a person reads them.
#include <catch2/catch.hpp>
#include <cmath>

#include "tools/slipbench/table.hpp"

using namespace slipbench;

TEST_CASE("table: columns line up, also under a sign of two bytes", "[tools][text]") {
  Table table;
  table.column("name", "", Table::Align::left);
  table.column("speed", "rpm");
  table.row({"a", "1.5"});
  table.row({"long", "12 ± 3"});
  CHECK(table.text() ==
        "  name   speed\n"
        "           rpm\n"
        "  a        1.5\n"
        "  long  12 ± 3\n");
}

TEST_CASE("number: significant digits", "[tools][text]") {
  CHECK(significant(1234.56) == "1235");
  CHECK(significant(123456.7) == "123457");
  CHECK(significant(0.0123456) == "0.01235");
  CHECK(significant(-1.0, 3) == "-1.00");
  CHECK(significant(0.0) == "0");
  CHECK(significant({}) == "-");
  CHECK(significant(std::nan("")) == "-");
  CHECK(significant(1.5e-9, 3) == "1.50e-09");
  CHECK(significant(2.5e8, 2) == "2.5e+08");
  CHECK(plain(0.8) == "0.8");
  CHECK(plain(1e-5) == "1e-05");
  CHECK(plain({}) == "-");
}

TEST_CASE("number: a mean with as many decimals as its half width deserves", "[tools][text]") {
  CHECK(plus_minus(3.2141, 0.0512) == "3.214 ± 0.051");
  CHECK(plus_minus(9.29591, 0.00231) == "9.296 ± 0.002");
  CHECK(plus_minus(-120.4, 33.0) == "-120 ± 33");
  CHECK(plus_minus(0.004, 0.25) == "0.00 ± 0.25");
  CHECK(plus_minus(5.0, 0.0) == "5.000 ± 0.000");
}
