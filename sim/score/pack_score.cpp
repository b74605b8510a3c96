#include "sim/score/pack_score.hpp"

#include <algorithm>
#include <array>

#include "plant/math/lanes.hpp"
#include "sim/score/drive_tally.hpp"

namespace slipbench {

namespace {

using Pack = Lanes<Sse2, 4>;
using FourBases = std::array<const ScoreBasis*, Pack::width>;

// Place of a number in an Estimate.
enum class Field : std::size_t { speed, rotor_flux, rotor_flux_angle, torque };

FourBases from(const std::vector<ScoreBasis>& bases, std::size_t first) {
  FourBases four{};
  for (std::size_t i = 0; i < four.size(); ++i) four[i] = &bases[std::min(first + i, bases.size() - 1)];
  return four;
}

}  // namespace

struct PackScore::Four {
  ScoreLimits<Pack> limits;
  DriveTally<Pack> drive;
  std::vector<EstimatorTally<Pack>> estimators;

  Four(const FourBases& bases, std::size_t used, std::size_t count)
      : limits(bases), drive(bases, used), estimators(count) {}

  void judge(const PackView& view, std::size_t first) {
    const auto plant = [&](P which) { return Pack::load(view.column(which) + first); };
    const JudgedBy<Pack> truth{plant(P::speed_rpm), plant(P::rotor_flux), plant(P::rotor_flux_angle), plant(P::torque)};
    const MaskOf<Pack> in_window = limits.in_window(view.time_s);
    for (std::size_t e = 0; e < estimators.size(); ++e) {
      const auto number = [&](Field f) { return Pack::load(view.estimate(e, static_cast<std::size_t>(f)) + first); };
      const JudgedEstimate<Pack> estimate{number(Field::speed), number(Field::rotor_flux),
                                          number(Field::rotor_flux_angle), number(Field::torque)};
      estimators[e].judge(limits, in_window, truth, estimate, view.time_s);
    }
    if (!any(in_window)) return;
    const MaskOf<Pack> clipped = Pack::load(view.clipped + first) != Pack(0.0);
    drive.judge(limits, in_window, plant, clipped, view.time_s);
  }
};

PackScore::PackScore(const std::vector<ScoreBasis>& bases, std::size_t estimators) {
  for (std::size_t first = 0; first < bases.size(); first += Pack::width)
    fours_.emplace_back(from(bases, first), std::min(Pack::width, bases.size() - first), estimators);
}

PackScore::~PackScore() = default;

void PackScore::control_tick(const PackView& view) {
  for (std::size_t i = 0; i < fours_.size(); ++i) fours_[i].judge(view, i * Pack::width);
}

std::vector<EstimatorFigures> PackScore::estimators(std::size_t lane) const {
  std::vector<EstimatorFigures> all;
  for (const auto& tally : fours_[lane / Pack::width].estimators) all.push_back(tally.figures(lane % Pack::width));
  return all;
}

DriveFigures PackScore::drive(std::size_t lane) const {
  return fours_[lane / Pack::width].drive.figures(lane % Pack::width);
}

}  // namespace slipbench
