// A profile for each lane, read as one: the lines that hold at a time, side by side. Lanes may have knots of their own.
#pragma once

#include <array>
#include <limits>

#include "sim/engine/setup.hpp"

namespace slipbench {

template <class Real>
class ProfilePack {
 public:
  // `get(*items[lane])` gives one lane's profile.
  template <class Items, class Get>
  ProfilePack(const Items& items, Get get) {
    for (std::size_t lane = 0; lane < profiles_.size(); ++lane) profiles_[lane] = get(*items[lane]);
    seek(0.0);
  }

  // The lines that hold just after time t. As long as no lane passes a knot: two comparisons.
  const Line<Real>& line_at(double t) {
    if (!(t >= from_ && t < until_)) seek(t);
    return line_;
  }
  // From when until when, around the time last asked for, every lane stands still; no time at all where one moves.
  [[nodiscard]] std::array<double, 2> level() const {
    constexpr double never = std::numeric_limits<double>::infinity();
    return any(line_.slope != Real(0.0)) ? std::array{never, -never} : std::array{from_, until_};
  }

 private:
  void seek(double t) {
    Stretch all;
    for (std::size_t lane = 0; lane < profiles_.size(); ++lane) {
      const Stretch one = profiles_[lane].stretch_at(t);
      set_lane(line_.value, lane, one.line.value);
      set_lane(line_.slope, lane, one.line.slope);
      set_lane(line_.start, lane, one.line.start);
      all.from = max(all.from, one.from);
      all.until = min(all.until, one.until);
    }
    from_ = all.from;
    until_ = all.until;
  }

  std::array<Profile, width_of<Real>> profiles_;
  Line<Real> line_;
  double from_ = 0.0, until_ = 0.0;
};

}  // namespace slipbench
