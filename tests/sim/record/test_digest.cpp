// Digests of a run: the byte form of rows, and what they do and do not depend on.
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <vector>

#include "sim/record/digest.hpp"

using namespace slipbench;

namespace {

RunInfo info_of(std::vector<std::string> names) {
  RunInfo info;
  info.plant = plant_columns();
  info.estimator_names = std::move(names);
  return info;
}

}  // namespace

TEST_CASE("digest: numbers enter as little-endian float64, NaN in one form", "[record][published]") {
  // python3: hashlib.sha256(struct.pack('<4d', 1.0, -0.0, float('nan'), 0.1)).hexdigest(), CPython packing NaN as 7ff8...
  Sha256 sha;
  const std::vector<double> numbers = {1.0, -0.0, -std::numeric_limits<double>::quiet_NaN(), 0.1};
  add_numbers(sha, numbers);
  CHECK(sha.hex() == "cbafaab80f198b3b1a74548d1224c5bda41dd10507fc16d58fddd5431ddca7ae");
}

TEST_CASE("digest: each estimator has its own, untouched by its neighbours and by measured columns",
          "[record][property]") {
  PlantRow plant{};
  plant[P::speed_rpm] = 12.5;
  const std::vector<double> one = {1, 2, 3, 4, 5}, both = {1, 2, 3, 4, 5, 6, 7, 8, 9, 10}, measured = {0.5};
  RunDigest alone, together;
  alone.begin(info_of({"a"}));
  together.begin(info_of({"a", "b"}));
  alone.trace_row({0, &plant, {}, one});
  together.trace_row({0, &plant, measured, both});
  CHECK(alone.plant() == together.plant());
  CHECK(alone.estimator(0) == together.estimator(0));
  CHECK(together.estimator(0) != together.estimator(1));
  plant[P::speed_rpm] = std::nextafter(12.5, 13.0);  // one bit shows
  alone.trace_row({1, &plant, {}, one});
  plant[P::speed_rpm] = 12.5;
  together.trace_row({1, &plant, {}, both});
  CHECK(alone.plant() != together.plant());
  CHECK(alone.estimator(0) == together.estimator(0));
}
