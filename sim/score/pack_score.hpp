// What the estimates and the drive were worth in each case of a pack of lanes: the figures that EstimatorScore and DriveScore
// give the case alone, to the bit, reckoned in lanes too.
//
// In lanes of SSE2, which every processor here has, four at a time: a pack may be of any set, and its width is a whole multiple
// of four. Lanes that were lost go on being reckoned; what they are then worth means nothing.
#pragma once

#include <vector>

#include "sim/engine/lanes/run_pack.hpp"
#include "sim/score/basis.hpp"
#include "sim/score/figures.hpp"

namespace slipbench {

class PackScore : public PackObserver {
 public:
  // One basis a case of the pack, in order. `estimators`: how many each has.
  PackScore(const std::vector<ScoreBasis>& bases, std::size_t estimators);
  ~PackScore() override;
  void control_tick(const PackView& view) override;

  [[nodiscard]] std::vector<EstimatorFigures> estimators(std::size_t lane) const;
  [[nodiscard]] DriveFigures drive(std::size_t lane) const;

 private:
  struct Four;  // lanes
  std::vector<Four> fours_;
};

}  // namespace slipbench
