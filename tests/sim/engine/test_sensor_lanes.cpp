// Sensors in lanes: each lane gives the very bits that double gives alone, whatever its neighbours do. Sse2 is in every
// x86-64 processor; a set's other widths run the same operators (tests/plant holds those).
#include <array>
#include <catch2/catch.hpp>
#include <cstring>

#include "plant/math/lanes.hpp"
#include "sim/engine/noise.hpp"
#include "sim/engine/speed_sensor.hpp"

using namespace slipbench;

namespace {

constexpr std::size_t width = 4;
using Pack = Lanes<Sse2, width>;

template <template <class> class Struct>
Struct<Pack> packed(const std::array<Struct<double>, width>& alone) {
  Struct<Pack> pack;
  const auto targets = numbers_of<Pack>(pack);
  for (std::size_t lane = 0; lane < width; ++lane) {
    const auto sources = numbers_of<const double>(alone[lane]);
    for (std::size_t i = 0; i < targets.size(); ++i) targets[i]->set(lane, *sources[i]);
  }
  return pack;
}

bool same_bits(const Pack& pack, std::size_t lane, double alone) {
  const double x = pack.get(lane);
  return std::memcmp(&x, &alone, sizeof x) == 0;
}

}  // namespace

TEST_CASE("lanes: encoder and tachogenerator give double's bits", "[engine][lanes]") {
  const double h = 10e-6;
  for (const SpeedSensorKind kind : {SpeedSensorKind::encoder, SpeedSensorKind::tachogenerator}) {
    std::array<SpeedSensor<double>, width> sensor;
    std::array<SpeedSensorState<double>, width> state;
    SpeedSensorTiming timing;
    for (std::size_t lane = 0; lane < width; ++lane) {
      const auto l = static_cast<double>(lane);
      SpeedSensorData data{
          kind, 1.0 + l, 100.0 * l, {500 + 500 * static_cast<std::int64_t>(lane), 1e6 + 3e6 * l, 0.01 + 0.002 * l}};
      timing = speed_sensor_timing(data, 10, 10 * h);
      sensor[lane] = prepare_speed_sensor(data, h);
      state[lane] = begin_speed_sensor(sensor[lane], 0.1 * l, 30.0 * l, 0);
    }
    const auto pack = packed<SpeedSensor>(sensor);
    auto pack_state = packed<SpeedSensorState>(state);
    // Lanes reverse, tremble and rest (timeout) at different times.
    const auto angle = [&](std::size_t lane, std::int64_t n) {
      const double t =
          static_cast<double>(std::min<std::int64_t>(n, 4000 + 1500 * static_cast<std::int64_t>(lane))) * h;
      return 0.1 * static_cast<double>(lane) + 30.0 * static_cast<double>(lane) * t * (1.0 - 12.0 * t) +
             2e-3 * sincos(900.0 * t).sin;
    };
    bool same = true;
    int told = 0;
    for (std::int64_t tick = 1; tick <= 1200; ++tick) {
      for (std::int64_t n = (tick - 1) * 10; n < tick * 10; ++n) {
        Pack before, after, speed;
        for (std::size_t lane = 0; lane < width; ++lane) {
          before.set(lane, angle(lane, n));
          after.set(lane, angle(lane, n + 1));
          speed.set(lane, (after.get(lane) - before.get(lane)) / h);
          advance(state[lane], before.get(lane), after.get(lane), speed.get(lane), n, sensor[lane], timing);
        }
        advance(pack_state, before, after, speed, n, pack, timing);
      }
      const Pack read = read_speed(pack_state, tick, Pack(0.5), pack, timing);
      for (std::size_t lane = 0; lane < width; ++lane) {
        const double alone = read_speed(state[lane], tick, 0.5, sensor[lane], timing);
        same = same && same_bits(read, lane, alone);
        told += alone != 0.0 ? 1 : 0;
      }
    }
    CHECK(same);
    CHECK(told > 2000);  // of 4800: the comparison was not of zeros
  }
}

TEST_CASE("lanes: analog channel and normal transform give double's bits", "[engine][lanes]") {
  std::array<AnalogSensor<double>, width> sensor;
  std::array<AnalogState<double>, width> state;
  for (std::size_t lane = 0; lane < width; ++lane) {
    const auto l = static_cast<double>(lane);
    // Lane 0 without converter, lane 3 without filter, lane 2 clipping.
    sensor[lane] =
        prepare_analog_sensor({0.1 * l, 3000.0 - 1000.0 * l, 0.01 * l, -0.02 * l,
                               lane == 0 ? 0 : 8 + 2 * static_cast<std::int64_t>(lane), lane == 2 ? 5.0 : 20.0},
                              10e-6);
    state[lane] = begin_analog(l);
  }
  const auto pack = packed<AnalogSensor>(sensor);
  auto pack_state = packed<AnalogState>(state);
  const Noise noise(31, 0);
  const NoiseChannel channel("current_a");
  bool same = true, clipped = false;
  for (std::int64_t n = 0; n < 5000; ++n) {
    Pack u1, u2, input;
    for (std::size_t lane = 0; lane < width; ++lane) {
      const auto tick = static_cast<std::int64_t>(width) * n + static_cast<std::int64_t>(lane);
      const PhiloxBlock w = noise.words(channel, tick);
      u1.set(lane, uniform_from_words(w[0], w[1]));
      u2.set(lane, uniform_from_words(w[2], w[3]));
      input.set(lane, 9.0 * sincos(0.01 * static_cast<double>(n) + static_cast<double>(lane)).cos);
    }
    const Pack normal = normals_from_uniforms(u1, u2).even;
    filter_step(pack_state, input, pack);
    const AnalogReading<Pack> read = convert(pack_state, normal, pack);
    for (std::size_t lane = 0; lane < width; ++lane) {
      const double normal_alone = normals_from_uniforms(u1.get(lane), u2.get(lane)).even;
      filter_step(state[lane], input.get(lane), sensor[lane]);
      const AnalogReading<double> alone = convert(state[lane], normal_alone, sensor[lane]);
      same = same && same_bits(normal, lane, normal_alone) && same_bits(read.value, lane, alone.value) &&
             same_bits(read.clipped, lane, alone.clipped);
      clipped = clipped || alone.clipped != 0.0;
    }
  }
  CHECK(same);
  CHECK(clipped);
}
