// What the estimates and the drive were worth in each case of a pack of lanes: the figures that EstimatorScore and DriveScore
// give the case alone, to the bit, reckoned in lanes too.
//
// In lanes of SSE2, which every processor here has, four at a time: a pack may be of any set, and its width is a whole multiple
// of four. Lanes that were lost go on being reckoned; what they are then worth means nothing.
#pragma once

#include <functional>
#include <vector>

#include "sim/engine/lanes/run_pack.hpp"
#include "sim/score/basis.hpp"
#include "sim/score/figures.hpp"

namespace slipbench {

class PackScore : public PackObserver {
 public:
  // One basis a case of the pack, in order. `estimators`: how many each has. `keep_going` is asked now and then; false stops the pack.
  PackScore(const std::vector<ScoreBasis>& bases, std::size_t estimators, std::function<bool()> keep_going = {});
  ~PackScore() override;
  void control_tick(const PackView& view) override;
  [[nodiscard]] bool keep_going(std::int64_t tick) override {
    constexpr std::int64_t ticks_between = 64;
    return !keep_going_ || tick % ticks_between != 0 || keep_going_();
  }

  [[nodiscard]] std::vector<EstimatorFigures> estimators(std::size_t lane) const;
  [[nodiscard]] DriveFigures drive(std::size_t lane) const;

 private:
  struct Four;  // lanes
  std::vector<Four> fours_;
  std::function<bool()> keep_going_;
};

}  // namespace slipbench
