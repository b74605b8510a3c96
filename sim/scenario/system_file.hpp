// A state-space file: [system], and what `design` is asked for it, [design]; read from TOML, checked, reduced where it is a descriptor.
//
//   x' = A x + B u, y = C x + D u        or, with sample_period_s,  x[k+1] = A x[k] + B u[k]
//   E x' = A x + B u                     E, where given: rows of zeros are algebraic; reduced to the form above at once
// Shapes as in plant/linear/system.hpp. Names of states, inputs and outputs are optional.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "plant/linear/descriptor.hpp"
#include "plant/linear/system.hpp"
#include "sim/scenario/read.hpp"

namespace slipbench {

enum class DesignKind { lqr, place, observer, kalman, pi };

// [design]. Matrices and lists that are not given are empty.
struct DesignRequest {
  DesignKind kind = DesignKind::lqr;
  std::string place;                              // of the table: "file.toml:8:1"
  linear::Matrix Q, R, N;                         // cost, u the controlled inputs:   x' Q x + u' R u + 2 x' N u
  linear::Matrix Q_integral;                      // q x q, cost of the tracked outputs' integrals: integral action
  std::vector<Eigen::Index> tracked;              // outputs that a reference is for, q of them (all)
  std::vector<Eigen::Index> controlled;           // inputs that the gain drives (all); the others disturb
  linear::Matrix W, V;                            // intensities of process noise (n x n) and measurement noise (p x p)
  std::vector<linear::Complex> poles;             // kind place: controller's; kind observer: observer's
  std::vector<linear::Complex> controller_poles;  // beside observer and kalman
  std::vector<linear::Complex> observer_poles;    // beside lqr and place
  std::optional<double> faster_than_controller;
  std::string rule;  // pi: "magnitude_optimum" | "symmetric_optimum"
  std::optional<double> plant_gain, large_lag_s, small_lag_s,
      symmetric_factor;  // pi; derived from the system's poles where absent

  [[nodiscard]] bool has_weights() const { return R.size() > 0; }
};

struct SystemFile {
  std::string path, title, source;
  std::string place;                         // of [system]
  linear::System system;                     // reduced, where it was a descriptor
  linear::Matrix E;                          // as given; empty: none
  std::vector<linear::Redundant> redundant;  // variables that the reduction took out
  std::optional<DesignRequest> design;
};

// "lqr", ...
std::string_view name_of(DesignKind kind);

// Throws InputError with file:line:column. A key of [design] that goes with other kinds alone is refused, unless the kind comes
// from --set: then what the file holds for its own kind is left aside.
SystemFile read_system_file(const std::string& path, const std::vector<Override>& overrides = {});
SystemFile read_system_text(const std::string& text, const std::string& name,
                            const std::vector<Override>& overrides = {});

}  // namespace slipbench
