// The C doors, compiled as C99 in doors_c99.c, against what C++ hands over.
#include <catch2/catch.hpp>

#include "controllers/control.hpp"
#include "estimators/sample.hpp"
#include "tests/controllers/doors_c99.h"

using namespace slipbench;

namespace {

template <class T, class Field>
std::size_t place(const T& whole, const Field& field) {
  return static_cast<std::size_t>(reinterpret_cast<const char*>(&field) - reinterpret_cast<const char*>(&whole));
}

}  // namespace

TEST_CASE("doors: a C99 compiler finds every field where C++ puts it", "[controllers][contract]") {
  const Measurement<double> m;
  const std::size_t of_m[] = {sizeof m,
                              place(m, m.size),
                              place(m, m.version),
                              place(m, m.tick),
                              place(m, m.current.x),
                              place(m, m.current.y),
                              place(m, m.dc_link),
                              place(m, m.speed),
                              place(m, m.rotor_flux),
                              place(m, m.rotor_flux_angle),
                              place(m, m.speed_reference),
                              place(m, m.torque_reference)};
  for (std::size_t i = 0; i < std::size(of_m); ++i) CHECK(measurement_layout[i] == of_m[i]);
  const Command<double> c;
  const std::size_t of_c[] = {sizeof c,
                              place(c, c.size),
                              place(c, c.version),
                              place(c, c.duty.a),
                              place(c, c.duty.b),
                              place(c, c.duty.c),
                              place(c, c.clipped),
                              place(c, c.rotor_flux_reference),
                              place(c, c.torque_reference),
                              place(c, c.current_reference.x),
                              place(c, c.current_reference.y)};
  for (std::size_t i = 0; i < std::size(of_c); ++i) CHECK(command_layout[i] == of_c[i]);
  CHECK(sample_and_estimate_size[0] == sizeof(Sample<double>));
  CHECK(sample_and_estimate_size[1] == sizeof(Estimate<double>));
}

TEST_CASE("doors: a controller in C reads a measurement and answers a command", "[controllers][contract]") {
  Measurement<double> m;
  m.tick = 7;
  m.current = {1.0, 2.0};
  m.dc_link = 500.0;
  m.speed_reference = 50.0;
  m.torque_reference = 3.0;
  Command<double> c;
  foreign_controller(&m, &c);
  CHECK(c.size == sizeof(slipbench_command));
  CHECK(c.version == 1);
  CHECK(c.duty.a == 0.6);
  CHECK(c.duty.b == 0.5);
  CHECK(c.torque_reference == 10.0);
  CHECK(c.current_reference.y == 2.0);
}
