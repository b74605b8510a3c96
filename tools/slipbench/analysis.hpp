// What a linear system is: everything plant/linear says of it, put together for a report, a script and a figure.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "plant/linear/decomposition.hpp"
#include "plant/linear/descriptor.hpp"
#include "plant/linear/discretise.hpp"
#include "plant/linear/frequency_response.hpp"
#include "plant/linear/gramians.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/pbh.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/staircase.hpp"

namespace slipbench {

// Something that a system has, or a sentence why it has none.
template <class T>
struct Maybe {
  std::optional<T> value;
  std::string why;
  explicit operator bool() const { return value.has_value(); }
  const T* operator->() const { return &*value; }
  const T& operator*() const { return *value; }
};

struct Discretised {
  linear::Discretisation method;
  double period_s = 0.0;
  linear::System system;
  linear::DiscretisationError error;
};

struct OperatingValue {
  std::string column;
  double value;
};

struct Analysis {
  std::string title, what;  // what: "state-space file", "drive", "machine"
  linear::System system;
  std::vector<linear::Redundant> redundant;
  std::vector<linear::Mode> modes;  // with tests, one each
  std::vector<linear::ModeTest> tests;
  linear::Verdict verdict;
  linear::Ranks ranks;
  bool stabilisable = true, detectable = true;
  std::string stabilisable_why, detectable_why;
  Maybe<linear::Minimal> minimal, balanced;
  Maybe<linear::KalmanForm> parts;
  Maybe<linear::Modal> modal;
  Maybe<linear::Gramians> gramians;
  Maybe<std::vector<linear::Complex>> zeros;
  Maybe<linear::Matrix> dc_gain;
  std::vector<Maybe<Discretised>> discretised;
  double at_Hz = 0.0;  // 0: not asked
  Maybe<linear::FrequencyPoint> at;
  std::vector<OperatingValue> operating_point;  // of a drive
  std::vector<std::string> warnings;

  [[nodiscard]] Eigen::Index minimal_order() const { return minimal ? minimal->system.order() : 0; }
};

// period_s, at_Hz: 0 where not asked.
Analysis analyse(const linear::System& system, double period_s, double at_Hz);

std::string analysis_report(const Analysis& analysis);
std::string analysis_figure(const Analysis& analysis);  // SVG

}  // namespace slipbench
